const marks = {
  empty: {
    colour: 'text-flint-2',
    shape: <circle cx="6" cy="6" r="4.4" fill="none" stroke="currentColor" strokeWidth="1.3" />,
  },
  drafted: {
    colour: 'text-flint-2',
    shape: (
      <>
        <circle cx="6" cy="6" r="4.4" fill="none" stroke="currentColor" strokeWidth="1.3" />
        <path d="M6 1.6A4.4 4.4 0 0 1 6 10.4Z" fill="currentColor" />
      </>
    ),
  },
  checked: {
    colour: 'text-moss',
    shape: (
      <>
        <circle cx="6" cy="6" r="5" fill="currentColor" />
        <path d="M3.6 6.2L5.3 8L8.5 4.3" fill="none" stroke="var(--chalk)" strokeWidth="1.4" />
      </>
    ),
  },
  'changed since check': {
    colour: 'text-madder',
    shape: <path d="M6 .6L11.4 6L6 11.4L.6 6Z" fill="currentColor" />,
  },
} as const

export type Mark = keyof typeof marks

/** The state of a section by its shape; the word stands beside it or is read out. */
export function StateMark({ state, labelled = false }: { state: Mark; labelled?: boolean }) {
  const { colour, shape } = marks[state]
  return (
    <svg
      viewBox="0 0 12 12"
      className={`size-3 shrink-0 ${colour}`}
      role={labelled ? 'img' : undefined}
      aria-label={labelled ? state : undefined}
      aria-hidden={labelled ? undefined : true}
    >
      {shape}
    </svg>
  )
}
