import type { SubmissionResult } from '@conform-to/react'
import { useId } from 'react'
import { Form, useNavigation } from 'react-router'
import { Button } from '~/components/button'
import { TextField } from '~/components/field'
import { FormMessage } from '~/components/form-message'
import { Notice } from '~/components/notice'
import type { Warning } from '~/solver/result'
import { type Acceptance, acceptanceInWords, acceptanceOf, notAccepted } from './acceptance'
import { byGravity, severityWords } from './account'

const tones = { serious: 'alarm', check: 'warn', note: 'note' } as const

/**
 * What a run says about itself, the gravest first, each with its severity in words. Warnings that somebody has to
 * accept carry who did and why, or else a tick for those who may; one reason is given for all that are ticked.
 */
export function RunWarnings({
  runId,
  warnings,
  acceptances,
  mayAccept,
  result,
  day,
}: {
  runId: number
  warnings: readonly Warning[]
  acceptances: readonly Acceptance[]
  mayAccept: boolean
  /** What came of the form that was sent last. */
  result: SubmissionResult<string[]> | undefined
  /** The day of an instant by the site's calendar. */
  day: (iso: string) => string
}) {
  const formId = useId()
  const open = notAccepted(warnings, acceptances)
  return (
    <section aria-label="Warnings of the run">
      {byGravity(warnings).map((warning) => {
        const acceptance = acceptanceOf(warning, acceptances)
        return (
          <Notice
            key={`${warning.code} ${warning.text}`}
            tone={tones[warning.severity]}
            title={severityWords[warning.severity]}
          >
            <p>{warning.text}</p>
            {acceptance && (
              <p className="mt-1 font-semibold">
                <span aria-hidden className="text-moss">
                  ✓{' '}
                </span>
                {capitalised(acceptanceInWords(acceptance, day))}
              </p>
            )}
            {open.includes(warning) &&
              (mayAccept ? (
                <label className="screen-only mt-1.5 flex w-fit items-center gap-2 font-semibold">
                  <input type="checkbox" name="warnings" value={warning.text} form={formId} />
                  Accept this warning
                </label>
              ) : (
                <p className="mt-1 font-semibold">
                  Nobody has accepted this yet: until then a package with this run is neither signed nor
                  issued.
                </p>
              ))}
          </Notice>
        )
      })}
      {mayAccept && open.length > 0 && (
        <AcceptForm key={acceptances.length} id={formId} runId={runId} count={open.length} result={result} />
      )}
    </section>
  )
}

function AcceptForm({
  id,
  runId,
  count,
  result,
}: {
  id: string
  runId: number
  count: number
  result: SubmissionResult<string[]> | undefined
}) {
  const busy = useNavigation().state !== 'idle'
  return (
    <Form
      method="post"
      id={id}
      noValidate
      preventScrollReset
      className="screen-only my-3 grid max-w-2xl gap-3 border border-rule px-4 py-3"
    >
      <p className="text-[0.95rem]">
        {count === 1 ? 'One warning of this run waits' : `${count} warnings of this run wait`} for somebody to
        accept {count === 1 ? 'it' : 'them'}. Until then a package with this run is neither signed nor issued;
        the reason is printed beside the warning, and the checker reads it.
      </p>
      <FormMessage result={result} />
      {result?.error?.warnings && <Notice tone="alarm" title={result.error.warnings.join(' ')} live />}
      <input type="hidden" name="runId" value={runId} />
      <TextField
        label="Why the result may be used all the same"
        name="reason"
        maxLength={1000}
        defaultValue={typeof result?.initialValue?.reason === 'string' ? result.initialValue.reason : ''}
        errors={result?.error?.reason ?? undefined}
      />
      <div>
        <Button type="submit" look="primary" name="intent" value="accept" disabled={busy}>
          Accept what is ticked
        </Button>
      </div>
    </Form>
  )
}

function capitalised(words: string): string {
  return words.charAt(0).toUpperCase() + words.slice(1)
}
