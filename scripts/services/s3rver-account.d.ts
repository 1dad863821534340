declare module 's3rver/lib/models/account.js' {
  const AWSAccount: {
    DUMMY_ACCOUNT: { createKeyPair(accessKeyId: string, secretAccessKey: string): void }
  }
  export default AWSAccount
}
