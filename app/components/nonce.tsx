import { createContext, useContext } from 'react'

const NonceContext = createContext('')

export const NonceProvider = NonceContext.Provider

/**
 * The nonce of this page's Content-Security-Policy. In the browser the server's markup hides it from attributes,
 * so it is read back from a script element: otherwise hydration would see two values.
 */
export function useNonce(): string {
  const nonce = useContext(NonceContext)
  if (typeof document === 'undefined') return nonce
  return document.querySelector<HTMLScriptElement>('script[nonce]')?.nonce ?? nonce
}
