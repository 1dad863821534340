import type { ReactNode } from 'react'
import { Button } from './button'

/**
 * A deed that asks once more: its first button opens the question, the second one sends the form around it.
 * Works without scripts.
 */
export function Confirm({
  label,
  question,
  yes,
  name,
  value,
  disabled,
}: {
  label: ReactNode
  question: ReactNode
  yes: ReactNode
  name: string
  value: string
  disabled?: boolean
}) {
  return (
    <details>
      <summary className="inline-block rounded py-0.5 pr-2 text-[0.9rem] text-bourne hover:underline">
        {label}
      </summary>
      <p className="mt-1 mb-2 max-w-xs text-[0.9rem]">{question}</p>
      <Button type="submit" look="danger" name={name} value={value} disabled={disabled}>
        {yes}
      </Button>
    </details>
  )
}
