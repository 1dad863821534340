import type { ReactNode } from 'react'

/** Heading of a page outside the numbered sections. */
export function PageTitle({ title, actions }: { title: string; actions?: ReactNode }) {
  return (
    <div className="mb-5 flex flex-wrap items-end justify-between gap-x-5 gap-y-3">
      <title>{`${title} · Lavant`}</title>
      <h1 className="text-[1.75rem] leading-none font-semibold">{title}</h1>
      {actions}
    </div>
  )
}
