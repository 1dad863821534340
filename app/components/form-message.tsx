import { Notice } from './notice'

/** What came of the last form that was sent: an error of the form as a whole, or what was done. */
export function FormMessage({
  result,
}: {
  result: { error?: Record<string, string[] | null> | null; done?: string } | undefined
}) {
  const errors = result?.error?.['']
  if (errors && errors.length > 0) return <Notice tone="alarm" title={errors.join(' ')} live />
  if (result?.done) return <Notice tone="good" title={result.done} live />
  return null
}
