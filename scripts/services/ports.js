import { createServer } from 'node:net'
import { setTimeout as pause } from 'node:timers/promises'
import { CannotStart } from './cannot-start.js'

/**
 * The port that a variable asks for, or the default.
 * Throws CannotStart when the variable holds anything but a port number.
 */
export function portFrom(variables, name, standard) {
  const text = variables[name]
  if (text === undefined || text === '') return standard
  const port = Number(text)
  if (!/^\d+$/.test(text) || port < 1 || port > 65535) {
    throw new CannotStart(`${name} must be a port number from 1 to 65535, not "${text}".`)
  }
  return port
}

/** Error code of listening on a loopback port, or undefined when it is free. */
function refusalOf(port) {
  return new Promise((resolve) => {
    const server = createServer()
    server.once('error', (error) => resolve(error.code))
    server.listen({ port, host: '127.0.0.1', exclusive: true }, () => server.close(() => resolve(undefined)))
  })
}

/**
 * Makes sure that a port can be listened on. A process of an earlier run that was killed a moment ago may
 * still be letting go of it, so a taken port is tried again for three seconds.
 * Throws CannotStart naming the port and the variable that moves it.
 */
export async function claimPort(port, variable, purpose) {
  let code = await refusalOf(port)
  for (let attempt = 0; code === 'EADDRINUSE' && attempt < 15; attempt++) {
    await pause(200)
    code = await refusalOf(port)
  }
  if (code === undefined) return
  const reason = code === 'EADDRINUSE' ? 'is taken by another program' : `cannot be used (${code})`
  throw new CannotStart(
    `Port ${port}, wanted for ${purpose}, ${reason}.\nGive another one in ${variable}, for instance: ${variable}=${port + 10}`,
  )
}

/** The first free port from `wanted` upwards that is not in `excluded`. Throws after a hundred. */
export async function freePort(wanted, excluded = []) {
  for (let port = wanted; port < wanted + 100; port++) {
    if (!excluded.includes(port) && (await refusalOf(port)) === undefined) return port
  }
  throw new CannotStart(`No free port between ${wanted} and ${wanted + 99}.`)
}
