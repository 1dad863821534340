/** A model that cannot be computed as written. `path` says where in the model file, `message` what and why. */
export class ModelError extends Error {
  readonly path: string

  constructor(path: string, message: string) {
    super(message)
    this.name = 'ModelError'
    this.path = path
  }
}

/** `value` if it is a finite number; otherwise refuses the model at `path`. */
export function requireFinite(value: unknown, path: string): number {
  if (typeof value !== 'number' || !Number.isFinite(value)) {
    throw new ModelError(path, 'must be a finite number')
  }
  return value
}

/** `value` if it is a finite number above zero; otherwise refuses the model at `path`. */
export function requirePositive(value: unknown, path: string): number {
  const number = requireFinite(value, path)
  if (number <= 0) throw new ModelError(path, `must be greater than zero, not ${number}`)
  return number
}

/** `value` if it is a finite number of zero or more; otherwise refuses the model at `path`. */
export function requireNotNegative(value: unknown, path: string): number {
  const number = requireFinite(value, path)
  if (number < 0) throw new ModelError(path, `must not be negative, but is ${number}`)
  return number
}
