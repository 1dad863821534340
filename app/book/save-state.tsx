import { Button } from '~/components/button'
import type { RowsEditor } from './use-rows'

const clock = new Intl.DateTimeFormat('en-GB', { hour: '2-digit', minute: '2-digit' })

/** One line that says where the saving stands; it belongs beside the title of the page. */
export function SaveState({ book }: { book: RowsEditor }) {
  if (!book.editable) return null
  const { saving } = book
  return (
    <span role="status" className="flex items-center gap-2 text-[0.93rem] text-flint-2">
      {saving.state === 'saving' && 'Saving …'}
      {saving.state === 'saved' && (saving.at ? `All saved, ${clock.format(saving.at)}` : 'All saved')}
      {saving.state === 'attention' && (
        <span className="text-madder">
          <span aria-hidden>◆ </span>
          {saving.count === 1 ? '1 cell needs attention' : `${saving.count} cells need attention`} before its
          row is saved
        </span>
      )}
      {saving.state === 'conflict' && (
        <span className="text-ochre">
          <span aria-hidden>▲ </span>
          {saving.count === 1 ? '1 row was' : `${saving.count} rows were`} changed by somebody else: choose
          below
        </span>
      )}
      {saving.state === 'failed' && (
        <>
          <span className="text-madder">
            <span aria-hidden>◆ </span>
            Not saved: {saving.message}. Your changes are kept here.
          </span>
          <Button onClick={book.retry}>Try again</Button>
        </>
      )}
    </span>
  )
}
