import type { SheetProps } from './sheet'
import { headerUnit, type SheetColumn, shownCell } from './sheet-cells'

/** The rows of a sheet as a plain table: on paper, without scripts, and until the grid has arrived. */
export function SheetTable({ label, columns, rows, units, empty, noun, nouns }: SheetProps) {
  if (rows.length === 0) {
    return (
      <p className="border border-rule bg-chalk-2 px-3 py-2.5 text-[0.93rem] text-flint-2">
        {empty ?? `No ${nouns ?? `${noun}s`} yet.`}
      </p>
    )
  }
  return (
    <section
      className="overflow-x-auto border border-rule"
      // biome-ignore lint/a11y/noNoninteractiveTabindex: a region that scrolls must be reachable by keyboard
      tabIndex={0}
      aria-label={`${label}, table`}
    >
      <table className="w-full border-collapse text-[0.93rem]">
        <thead>
          <tr className="border-b border-flint-2 bg-chalk-2">
            {columns.map((column) => (
              <th
                key={column.field}
                scope="col"
                className={`px-2.5 py-1.5 font-semibold ${isFigure(column) ? 'text-right' : 'text-left'}`}
              >
                {column.label}{' '}
                <span className="text-[0.82em] font-normal text-flint-2">{headerUnit(column, units)}</span>
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {rows.map((row) => (
            <tr key={row.id} className="border-b border-rule last:border-b-0">
              {columns.map((column) => {
                const typed = row.typed?.[column.field]
                const shown = column.reads
                  ? { text: column.reads(row.body), entered: undefined }
                  : shownCell(column, row.body[column.field], units)
                return (
                  <td
                    key={column.field}
                    className={`px-2.5 py-1.5 align-top ${isFigure(column) ? 'text-right' : 'text-left'}`}
                  >
                    {typed?.text ?? shown.text}
                    {!typed && shown.entered && (
                      <span className="ml-1.5 text-[0.82em] text-flint-2">{shown.entered}</span>
                    )}
                  </td>
                )
              })}
            </tr>
          ))}
        </tbody>
      </table>
    </section>
  )
}

/** Figures end at the right, words start at the left. */
export function isFigure(column: SheetColumn): boolean {
  return column.editor === 'quantity' || column.editor === 'number'
}
