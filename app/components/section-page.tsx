import type { ReactNode } from 'react'

export interface Reference {
  /** Number in the book, such as 3.1. */
  no: string
  text: ReactNode
  /** Draws the eye: something changed here since the check. */
  changed?: boolean
}

export interface Carried {
  label: ReactNode
  value: ReactNode
  unit?: string
  /** Error band, printed after the value. */
  band?: string
  note?: ReactNode
  state?: 'good' | 'warn' | 'alarm'
}

const noteLooks = {
  good: { colour: 'text-moss', shape: '●', size: 'text-[0.6rem]' },
  warn: { colour: 'text-ochre', shape: '▲', size: 'text-[0.7rem]' },
  alarm: { colour: 'text-madder', shape: '◆', size: 'text-[0.7rem]' },
} as const

/**
 * A section as a page of a calculation pad: the reference margin, the work, and the carry margin with the results
 * that other sections use. On a narrow screen the work comes first, then what it carries, then its references.
 */
export function SectionPage({
  number,
  title,
  actions,
  status,
  references,
  carried,
  carryFoot,
  children,
}: {
  number: number
  title: string
  actions?: ReactNode
  status?: ReactNode
  references: Reference[]
  carried: Carried[]
  carryFoot?: ReactNode
  children: ReactNode
}) {
  return (
    <div className="flex flex-1 flex-col wide:grid wide:grid-cols-[10.75rem_minmax(0,1fr)_15rem]">
      <title>{`${number} ${title} · Lavant`}</title>
      <aside
        aria-label="References"
        className="order-3 border-t border-rule px-4 py-4 text-[0.87rem] leading-[1.35] text-flint-2 wide:order-1 wide:border-t-0 wide:border-r wide:border-margin-rule wide:pt-[4.9rem] wide:pr-3.5 wide:pl-4.5"
      >
        <h2 className="sr-only">References</h2>
        {references.length === 0 ? (
          <p>No source is noted yet. Each row has room for one, and it appears here.</p>
        ) : (
          references.map((reference) => (
            <p key={reference.no} className={`mb-3.5 break-words ${reference.changed ? 'text-madder' : ''}`}>
              <b className="font-semibold text-flint">{reference.no}</b> {reference.text}
            </p>
          ))
        )}
      </aside>
      <main id="work" className="order-1 min-w-0 px-3 pt-4 pb-10 wide:order-2 wide:px-5.5 wide:pt-5">
        <div className="flex flex-wrap items-end justify-between gap-x-5 gap-y-3">
          <h1 className="text-[1.75rem] leading-none font-semibold">
            <span className="mr-2 font-normal text-flint-2">{number}</span> {title}
          </h1>
          {actions && <div className="screen-only flex flex-wrap items-center gap-2.5">{actions}</div>}
        </div>
        {status && <div className="mt-3 text-[0.93rem] text-flint-2 [&_a]:underline">{status}</div>}
        <div className="mt-4">{children}</div>
      </main>
      <aside
        aria-label="Carried forward"
        className="order-2 border-t-[1.5px] border-flint px-4 py-5 wide:order-3 wide:border-t-0 wide:border-l wide:border-margin-rule wide:px-4.5 wide:pt-6"
      >
        <h2 className="mb-3.5 text-[0.87rem] font-semibold text-flint-2">Carried forward</h2>
        {carried.length === 0 && <p className="text-[0.87rem] text-flint-2">Nothing yet.</p>}
        <dl>
          {carried.map((item, index) => (
            // biome-ignore lint/suspicious/noArrayIndexKey: the list is rebuilt whole and never reordered
            <div key={index} className="mb-3.5 border-b border-rule pb-3.5 last:border-b-0">
              <dt className="text-[0.87rem] text-flint-2">{item.label}</dt>
              <dd className="text-[1.5rem] leading-tight font-semibold">
                {item.value}
                {item.unit && (
                  <span className="ml-1.5 text-[1.1rem] font-normal text-flint-2">{item.unit}</span>
                )}
                {item.band && (
                  <small className="ml-1.5 text-[0.93rem] font-normal text-flint-2">{item.band}</small>
                )}
                {item.note && (
                  <p
                    className={`text-[0.87rem] leading-snug font-normal ${item.state ? noteLooks[item.state].colour : 'text-flint-2'}`}
                  >
                    {item.state && (
                      <span aria-hidden className={`mr-1 ${noteLooks[item.state].size}`}>
                        {noteLooks[item.state].shape}
                      </span>
                    )}
                    {item.note}
                  </p>
                )}
              </dd>
            </div>
          ))}
        </dl>
        {carryFoot}
      </aside>
    </div>
  )
}

/** A numbered heading inside the work: 3.1 Wells. */
export function Heading({ no, children, aside }: { no: string; children: ReactNode; aside?: ReactNode }) {
  return (
    <div className="mt-7 mb-2 flex flex-wrap items-baseline justify-between gap-3 first:mt-0">
      <h2 className="text-[1.15rem] font-semibold" id={`s${no.replace('.', '-')}`}>
        <span className="mr-1 font-normal text-flint-2">{no}</span> {children}
      </h2>
      {aside && <div className="text-[0.9rem] text-flint-2">{aside}</div>}
    </div>
  )
}
