import { useEffect, useRef } from 'react'
import { NavLink } from 'react-router'
import { type Mark, StateMark } from './state-mark'

export interface SpineEntry {
  number: number
  title: string
  to: string
  state: Mark
}

/**
 * The sections of the book down the left edge, with the state of each. On a narrow screen it lies across the top and
 * keeps the current section in view.
 */
export function Spine({
  entries,
  home,
  children,
}: {
  entries: SpineEntry[]
  home: { to: string; label: string }
  children?: React.ReactNode
}) {
  const list = useRef<HTMLOListElement>(null)
  useEffect(() => {
    const strip = list.current
    const current = strip?.querySelector<HTMLElement>('[aria-current="page"]')
    if (!strip || !current || strip.scrollWidth <= strip.clientWidth) return
    strip.scrollLeft = current.offsetLeft - strip.clientWidth / 2 + current.offsetWidth / 2
  })
  return (
    <nav
      aria-label="Calc book"
      className="screen-only sticky top-0 z-30 flex items-center border-b border-rule bg-chalk-2 wide:h-dvh wide:flex-col wide:items-stretch wide:overflow-y-auto wide:border-r wide:border-b-0"
    >
      <NavLink
        to={home.to}
        className="flex shrink-0 items-center px-3 py-2 text-[1.27rem] font-bold tracking-[0.02em] text-flint hover:no-underline wide:px-4.5 wide:pt-4 wide:pb-2"
        aria-label={home.label}
      >
        Lavant
      </NavLink>
      <ol ref={list} className="relative flex flex-1 overflow-x-auto wide:flex-col wide:overflow-visible">
        {entries.map((entry) => (
          <li key={entry.to} className="shrink-0">
            <NavLink
              to={entry.to}
              prefetch="intent"
              className="group flex items-center gap-1.5 border-b-2 border-transparent px-2.5 py-2.5 text-flint hover:bg-chalk hover:no-underline aria-[current=page]:border-bourne aria-[current=page]:bg-chalk aria-[current=page]:font-semibold wide:grid wide:grid-cols-[1.6rem_1fr_0.8rem] wide:border-b-0 wide:border-l-[3px] wide:py-1.5 wide:pr-4 wide:pl-4"
            >
              <b className="text-[1.1rem] font-semibold text-flint-2 tabular-nums">{entry.number}</b>
              <span className="sr-only leading-tight group-aria-[current=page]:not-sr-only wide:not-sr-only">
                {entry.title}
                <small
                  className={`hidden text-[0.8rem] leading-none font-normal wide:block ${
                    entry.state === 'changed since check' ? 'text-madder' : 'text-flint-2'
                  }`}
                >
                  {entry.state}
                </small>
              </span>
              <StateMark state={entry.state} />
            </NavLink>
          </li>
        ))}
      </ol>
      {children}
    </nav>
  )
}
