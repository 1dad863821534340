import type { ReactNode } from 'react'

export interface TitleBlockCell {
  label: string
  value: ReactNode
  /** Takes about twice the width of the others. */
  wide?: boolean
}

/** The strip across the top of every section page, as on a drawing: what this is, and who has signed it. */
export function TitleBlock({ cells }: { cells: TitleBlockCell[] }) {
  return (
    <header className="border-b-[1.5px] border-flint bg-chalk">
      <dl className="grid grid-cols-3 wide:flex">
        {cells.map((cell) => (
          <div
            key={cell.label}
            className={`min-w-0 border-r border-b border-rule px-3 py-1.5 last:border-r-0 wide:border-b-0 wide:px-3.5 wide:pt-2 wide:pb-1.5 ${
              cell.wide ? 'col-span-3 wide:flex-[2.2]' : 'wide:flex-1'
            }`}
          >
            <dt className="text-[0.8rem] text-flint-2">{cell.label}</dt>
            <dd
              className="truncate font-semibold"
              title={typeof cell.value === 'string' ? cell.value : undefined}
            >
              {cell.value}
            </dd>
          </div>
        ))}
      </dl>
    </header>
  )
}
