import { createContext, type RouterContext } from 'react-router'

const key = Symbol.for('lavant.client-address')
const place = globalThis as { [key]?: RouterContext<string> }

/**
 * Network address of whoever sent the request, as the web server sees it behind LAVANT_TRUSTED_PROXIES proxies;
 * 'unknown' where no web server of ours stands in front, in development and in tests.
 * Kept on the process: the server that sets it and the bundle that reads it each have a copy of this module.
 */
place[key] ??= createContext('unknown')
export const clientAddress: RouterContext<string> = place[key]
