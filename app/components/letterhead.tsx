import type { ReactNode } from 'react'

/** A page outside any calc book, before or without a sign-in: one sheet of the pad with its margin rule. */
export function Letterhead({ title, children }: { title: string; children: ReactNode }) {
  return (
    <div className="mx-auto flex min-h-dvh max-w-3xl flex-col px-4 pt-10 pb-12 sm:pt-20">
      <title>{`${title} · Lavant`}</title>
      <header className="border-b-[1.5px] border-flint pb-2">
        <p className="text-[1.27rem] font-bold tracking-[0.02em]">Lavant</p>
        <p className="text-flint-2">Groundwater heads for a site, answerable to its piezometers</p>
      </header>
      <main className="flex-1 border-margin-rule pt-7 sm:ml-16 sm:border-l sm:pl-8">
        <h1 className="mb-4 text-[1.75rem] leading-none font-semibold">{title}</h1>
        {children}
      </main>
    </div>
  )
}
