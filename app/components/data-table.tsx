import type { ReactNode } from 'react'

export interface Column<Row> {
  head: ReactNode
  unit?: string
  cell: (row: Row) => ReactNode
  /** Words start at the left, numbers end at the right. */
  words?: boolean
}

/** A ruled table that scrolls sideways with its first column in place. */
export function DataTable<Row>({
  columns,
  rows,
  rowKey,
  caption,
  empty = 'Nothing here yet.',
  chosen,
}: {
  columns: Column<Row>[]
  rows: Row[]
  rowKey: (row: Row) => string | number
  caption: string
  empty?: ReactNode
  chosen?: (row: Row) => boolean
}) {
  if (rows.length === 0)
    return <p className="border border-rule bg-chalk-2 px-3 py-2.5 text-flint-2">{empty}</p>
  return (
    // biome-ignore lint/a11y/noNoninteractiveTabindex: a region that scrolls must be reachable by keyboard
    <section className="overflow-x-auto border border-rule" tabIndex={0} aria-label={caption}>
      <table className="w-full border-collapse text-[0.93rem]">
        <caption className="sr-only">{caption}</caption>
        <thead>
          <tr className="border-b border-flint-2">
            {columns.map((column, index) => {
              // A heading without words is no heading: a screen reader would announce nothing.
              const Cell = column.head === '' ? 'td' : 'th'
              return (
                <Cell
                  // biome-ignore lint/suspicious/noArrayIndexKey: columns are fixed
                  key={index}
                  scope={Cell === 'th' ? 'col' : undefined}
                  className={`bg-chalk-2 px-2.5 py-1.5 font-semibold whitespace-nowrap ${
                    column.words || index === 0 ? 'text-left' : 'text-right'
                  } ${index === 0 ? 'sticky left-0 z-10' : ''}`}
                >
                  {column.head}
                  {column.unit && (
                    <span className="ml-1 text-[0.82em] font-normal text-flint-2">{column.unit}</span>
                  )}
                </Cell>
              )
            })}
          </tr>
        </thead>
        <tbody>
          {rows.map((row) => (
            <tr
              key={rowKey(row)}
              className={`border-b border-rule last:border-b-0 ${chosen?.(row) ? 'bg-bourne-2' : ''}`}
            >
              {columns.map((column, index) =>
                index === 0 ? (
                  <th
                    // biome-ignore lint/suspicious/noArrayIndexKey: columns are fixed
                    key={index}
                    scope="row"
                    className={`sticky left-0 px-2.5 py-1.5 text-left font-semibold whitespace-nowrap ${
                      chosen?.(row) ? 'bg-bourne-2' : 'bg-chalk'
                    }`}
                  >
                    {column.cell(row)}
                  </th>
                ) : (
                  <td
                    // biome-ignore lint/suspicious/noArrayIndexKey: columns are fixed
                    key={index}
                    className={`px-2.5 py-1.5 ${column.words ? 'text-left' : 'text-right whitespace-nowrap'}`}
                  >
                    {column.cell(row)}
                  </td>
                ),
              )}
            </tr>
          ))}
        </tbody>
      </table>
    </section>
  )
}
