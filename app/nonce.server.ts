import { randomBytes } from 'node:crypto'
import { createContext } from 'react-router'

/** The Content-Security-Policy nonce of one response; set by the root's middleware. */
export const nonceContext = createContext<string>('')

export function newNonce(): string {
  return randomBytes(16).toString('base64')
}

/** The policy of every page. Chart and grid libraries set style attributes; scripts need the nonce. */
export function contentSecurityPolicy(nonce: string, developing: boolean): string {
  return [
    "default-src 'self'",
    `script-src 'self' 'nonce-${nonce}' 'wasm-unsafe-eval'`,
    `style-src 'self' ${developing ? "'unsafe-inline'" : `'nonce-${nonce}'`}`,
    "style-src-attr 'unsafe-inline'",
    "font-src 'self'",
    "img-src 'self' data: blob:",
    `connect-src 'self'${developing ? ' ws:' : ''}`,
    "worker-src 'self'",
    "object-src 'none'",
    "base-uri 'none'",
    "form-action 'self'",
    "frame-ancestors 'none'",
  ].join('; ')
}
