import { Form, useNavigation } from 'react-router'
import { Button } from '~/components/button'
import { StateMark } from '~/components/state-mark'
import type { SectionStatus } from './sections'

interface CheckButtonProps {
  projectId: number
  status: SectionStatus
  /** can(member, 'check', 'section') */
  mayCheck: boolean
}

const shortDate = new Intl.DateTimeFormat('en-GB', {
  day: 'numeric',
  month: 'short',
  year: 'numeric',
  timeZone: 'UTC',
})

/** Says whether a section stands as it was checked and, to a checker, offers to tick it. */
export function CheckButton({ projectId, status, mayCheck }: CheckButtonProps) {
  const navigation = useNavigation()
  const { state, checkedBy, checkedAt } = status
  const by = checkedBy && checkedAt ? `${checkedBy}, ${shortDate.format(new Date(checkedAt))}` : null
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
          <Button type="submit" look="primary" disabled={state === 'empty' || navigation.state !== 'idle'}>
            Mark as checked
          </Button>
        </Form>
      )}
    </>
  )
}
