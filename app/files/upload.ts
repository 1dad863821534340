export interface UploadedPicture {
  fileId: number
  width: number
  height: number
}

/**
 * Sends a file as the raw body of a POST and reports how far it is, from 0 to 1.
 * Rejects with an Error whose message can be shown: the server's reason, or that the connection broke.
 */
export function uploadPicture(
  address: string,
  file: File,
  onProgress: (done: number) => void,
): Promise<UploadedPicture> {
  return new Promise((resolve, reject) => {
    // fetch reports no progress of what it sends.
    const request = new XMLHttpRequest()
    request.open('POST', `${address}?name=${encodeURIComponent(file.name)}`)
    request.setRequestHeader('Content-Type', 'application/octet-stream')
    request.responseType = 'json'
    request.upload.onprogress = (event) => {
      if (event.lengthComputable) onProgress(event.loaded / event.total)
    }
    request.onerror = () => reject(new Error('The connection broke before the file had arrived. Try again.'))
    request.onload = () => {
      const answer = request.response as Partial<UploadedPicture & { message: string }> | null
      const { fileId, width, height } = answer ?? {}
      if (request.status === 201 && fileId && width && height) resolve({ fileId, width, height })
      else reject(new Error(answer?.message ?? `The server did not take the file (${request.status}).`))
    }
    request.send(file)
  })
}
