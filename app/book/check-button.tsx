import { Form, useNavigation } from 'react-router'
import { Button } from '~/components/button'
import { localTime } from '~/components/local-time'
import { StateMark } from '~/components/state-mark'
import type { SectionStatus } from './sections'

interface CheckButtonProps {
  projectId: number
  /** Of the site, for the day of the check. */
  timeZone: string
  status: SectionStatus
  /** can(member, 'check', 'section') */
  mayCheck: boolean
}

/** Says whether a section stands as it was checked and, to a checker, offers to tick it. */
export function CheckButton({ projectId, timeZone, status, mayCheck }: CheckButtonProps) {
  const navigation = useNavigation()
  const { state, checkedBy, checkedAt } = status
  const by =
    checkedBy && checkedAt ? `${checkedBy}, ${localTime(timeZone).day(checkedAt.toISOString())}` : null
  return (
    <>
      {by && (
        <span className="flex items-center gap-1.5 text-[0.93rem] text-flint-2">
          <StateMark state={state} />
          {state === 'checked' ? `Checked by ${by}` : `Changed since it was checked by ${by}`}
        </span>
      )}
      {mayCheck && state !== 'checked' && (
        <Form method="post" action={`/projects/${projectId}/check`} preventScrollReset>
          <input type="hidden" name="section" value={status.key} />
          <input type="hidden" name="seen" value={status.digest} />
          <Button type="submit" look="primary" disabled={state === 'empty' || navigation.state !== 'idle'}>
            Mark as checked
          </Button>
        </Form>
      )}
    </>
  )
}
