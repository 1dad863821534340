import type { ReactNode } from 'react'

const tones = {
  note: 'border-bourne bg-bourne-2/50',
  good: 'border-moss',
  warn: 'border-ochre bg-ochre-2/60',
  alarm: 'border-madder bg-madder-2/60',
} as const

/** A message in the work: its tone is carried by the words as well as by the rule on its left. */
export function Notice({
  tone = 'note',
  title,
  children,
  live = false,
}: {
  tone?: keyof typeof tones
  title?: ReactNode
  children?: ReactNode
  live?: boolean
}) {
  return (
    <div
      className={`my-3 border-l-[3px] px-3 py-2 ${tones[tone]}`}
      role={live ? (tone === 'alarm' ? 'alert' : 'status') : undefined}
    >
      {title && <p className="font-semibold">{title}</p>}
      {children && <div className="text-[0.95rem]">{children}</div>}
    </div>
  )
}

/** What every result that bears on safety carries with it. */
export function Caution({ children }: { children?: ReactNode }) {
  return (
    <p className="mt-5 border-l-[3px] border-ochre pl-2.5 text-[0.87rem] leading-snug text-flint-2">
      {children ?? (
        <>
          Drawdown, seepage and uplift bear on safety. This result rests on the idealisation in section 1 and
          leaves out what that section says it leaves out. It does not replace the judgement of a qualified
          engineer; local codes and licensed practice govern.
        </>
      )}
    </p>
  )
}
