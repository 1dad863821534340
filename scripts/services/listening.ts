import type { Server } from 'node:http'

/** Resolves when the server listens. Rejects with the reason when the address cannot be had. */
export function listening(server: Server, port: number, host: string): Promise<void> {
  return new Promise((resolve, reject) => {
    server.once('error', reject)
    server.listen(port, host, () => {
      server.off('error', reject)
      resolve()
    })
  })
}

/** Takes no more connections and resolves when the requests in hand are answered. */
export function closed(server: Server): Promise<void> {
  return new Promise((resolve) => server.close(() => resolve()))
}
