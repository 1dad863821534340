/** The part of a field of Conform that a page needs. */
export interface FormField {
  key?: string
  id: string
  name: string
  initialValue?: unknown
  errors?: string[]
  required?: boolean
}

/** What Field, TextField and SelectField take from a field of Conform; its `key` is passed beside. */
export function fieldProps({ id, name, initialValue, errors, required }: FormField) {
  return {
    id,
    name,
    defaultValue: typeof initialValue === 'string' ? initialValue : undefined,
    errors,
    required,
  }
}
