import { type ComponentProps, type ReactNode, useId } from 'react'

const box =
  'w-full rounded border border-rule bg-chalk px-2.5 py-1.5 text-flint placeholder:text-flint-2 aria-invalid:border-madder read-only:bg-chalk-2 disabled:bg-chalk-2'

interface Labelled {
  label: ReactNode
  hint?: ReactNode
  errors?: string[]
}

function Frame({ id, label, hint, errors, children }: Labelled & { id: string; children: ReactNode }) {
  return (
    <div>
      <label htmlFor={id} className="mb-1 block text-sm font-semibold text-flint-2">
        {label}
      </label>
      {children}
      {hint && (
        <p id={`${id}-hint`} className="mt-1 text-[0.85rem] text-flint-2">
          {hint}
        </p>
      )}
      {errors && errors.length > 0 && (
        <p id={`${id}-error`} className="mt-1 text-[0.87rem] font-semibold text-madder">
          {errors.join(' ')}
        </p>
      )}
    </div>
  )
}

function described(id: string, { hint, errors }: Labelled) {
  const ids = [hint ? `${id}-hint` : '', errors?.length ? `${id}-error` : ''].filter(Boolean).join(' ')
  return { 'aria-describedby': ids || undefined, 'aria-invalid': errors?.length ? true : undefined } as const
}

/** One line of input with its label, hint and errors. Spread Conform's getInputProps (without `key`) into it. */
export function Field({ label, hint, errors, ...input }: Labelled & ComponentProps<'input'>) {
  const own = useId()
  const id = input.id ?? own
  return (
    <Frame id={id} label={label} hint={hint} errors={errors}>
      <input className={box} {...input} id={id} {...described(id, { label, hint, errors })} />
    </Frame>
  )
}

export function TextField({ label, hint, errors, ...input }: Labelled & ComponentProps<'textarea'>) {
  const own = useId()
  const id = input.id ?? own
  return (
    <Frame id={id} label={label} hint={hint} errors={errors}>
      <textarea rows={3} className={box} {...input} id={id} {...described(id, { label, hint, errors })} />
    </Frame>
  )
}

export function SelectField({
  label,
  hint,
  errors,
  children,
  ...input
}: Labelled & ComponentProps<'select'>) {
  const own = useId()
  const id = input.id ?? own
  return (
    <Frame id={id} label={label} hint={hint} errors={errors}>
      <select className={box} {...input} id={id} {...described(id, { label, hint, errors })}>
        {children}
      </select>
    </Frame>
  )
}
