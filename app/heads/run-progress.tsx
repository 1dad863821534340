import { useEffect, useRef, useState } from 'react'
import { useFetcher, useRevalidator } from 'react-router'
import { Button } from '~/components/button'
import { formatNumber } from '~/units'
import { type RunStatus, underWay } from './run'

const pollMilliseconds = 700
/** Without an answer for this many polls the page says so; it goes on asking. */
const patiencePolls = 5

interface Residual {
  iterations: number
  residual: number
}

export interface FollowedRun {
  status: RunStatus
  /** Residuals seen so far, in the order of iterations. */
  residuals: readonly Residual[]
  /** True while the server does not answer. */
  silent: boolean
}

/** Follows a run by polling while it is under way; picks up again after a reload, since the server keeps the state. */
function useRun(projectId: number, initial: RunStatus): FollowedRun {
  const [status, setStatus] = useState(initial)
  const [residuals, setResiduals] = useState<readonly Residual[]>(() => withResidual([], initial))
  const [silent, setSilent] = useState(false)
  const revalidator = useRevalidator()
  const revalidate = useRef(revalidator.revalidate)
  revalidate.current = revalidator.revalidate
  const open = underWay(status.state)

  useEffect(() => {
    if (!open) return
    const controller = new AbortController()
    let missed = 0
    let timer: ReturnType<typeof setTimeout>
    async function ask() {
      try {
        const response = await fetch(`/projects/${projectId}/runs/${initial.id}`, {
          headers: { Accept: 'application/json' },
          signal: controller.signal,
        })
        if (!response.ok) throw new TypeError(`The server answered ${response.status}.`)
        const next = (await response.json()) as RunStatus
        missed = 0
        setSilent(false)
        setStatus(next)
        setResiduals((before) => withResidual(before, next))
        if (!underWay(next.state)) {
          void revalidate.current()
          return
        }
      } catch (error) {
        if (controller.signal.aborted) return
        if (!(error instanceof TypeError || error instanceof SyntaxError)) throw error
        missed += 1
        if (missed >= patiencePolls) setSilent(true)
      }
      timer = setTimeout(ask, missed >= patiencePolls ? pollMilliseconds * 5 : pollMilliseconds)
    }
    timer = setTimeout(ask, pollMilliseconds)
    return () => {
      controller.abort()
      clearTimeout(timer)
    }
  }, [open, projectId, initial.id])

  return { status, residuals, silent }
}

function withResidual(before: readonly Residual[], { progress }: RunStatus): readonly Residual[] {
  const { iterations, residual } = progress ?? {}
  if (iterations === undefined || typeof residual !== 'number' || residual <= 0) return before
  const last = before.at(-1)
  if (last && iterations <= last.iterations) return before
  return [...before, { iterations, residual }]
}

/**
 * How a run stands: percent, iterations, the residual against iterations, cancel; after a restart of the server the offer to
 * run it again. Give it a `key` of the run's id.
 */
export function RunProgress({
  projectId,
  run,
  tolerance,
  mayRun,
}: {
  projectId: number
  run: RunStatus
  /** What the residual has to come down to; drawn as a line. */
  tolerance?: number
  mayRun: boolean
}) {
  const { status, residuals, silent } = useRun(projectId, run)
  const fetcher = useFetcher<{ ok: boolean; message?: string; cancelled?: boolean }>()
  const address = `/projects/${projectId}/runs/${status.id}`
  const open = underWay(status.state)
  const stopping = open && fetcher.data?.cancelled === true
  const busy = stopping || fetcher.state !== 'idle'
  const percent = open ? Math.max(0, Math.min(100, status.progress?.percent ?? 0)) : 100
  const act = (intent: string) => fetcher.submit({ intent }, { method: 'post', action: address })
  return (
    <section
      aria-label={`Run ${status.number}`}
      className="my-3 grid gap-x-5 gap-y-2 border border-rule bg-chalk-2 px-3 py-2.5 sm:grid-cols-[minmax(0,1fr)_15rem]"
    >
      <div className="min-w-0">
        <p className="flex flex-wrap items-baseline gap-x-2">
          <b className="font-semibold">Run {status.number}</b>
          <span className="text-flint-2">{status.caseName}</span>
          <span role="status" className={stateColour(status)}>
            {stateWords(status)}
          </span>
        </p>
        {open && (
          <>
            <div
              role="progressbar"
              aria-label={`Progress of run ${status.number}`}
              aria-valuemin={0}
              aria-valuemax={100}
              aria-valuenow={Math.round(percent)}
              className="mt-2 h-2 overflow-hidden rounded-full bg-chalk-3"
            >
              <div className="h-full bg-bourne transition-[width]" style={{ width: `${percent}%` }} />
            </div>
            <p className="mt-1 text-[0.9rem] text-flint-2">{progressWords(status, percent)}</p>
          </>
        )}
        {status.error && <p className="mt-1 text-[0.93rem] text-madder">{status.error}</p>}
        {silent && (
          <p className="mt-1 text-[0.93rem] text-ochre">The server does not answer; asking again.</p>
        )}
        {fetcher.data?.message && (
          <p role="alert" className="mt-1 text-[0.93rem] text-madder">
            {fetcher.data.message}
          </p>
        )}
        {mayRun && (open || status.state !== 'done') && (
          <p className="screen-only mt-2">
            {open ? (
              <Button onClick={() => act('cancel')} disabled={busy}>
                {stopping ? 'Stopping…' : `Cancel run ${status.number}`}
              </Button>
            ) : (
              <Button onClick={() => act('again')} disabled={busy}>
                Run again
              </Button>
            )}
          </p>
        )}
      </div>
      <ResidualChart residuals={residuals} tolerance={tolerance} />
    </section>
  )
}

function progressWords({ state, progress }: RunStatus, percent: number): string {
  if (state === 'queued') return 'It starts as soon as a thread is free; go on working meanwhile.'
  if (!progress?.iterations) return 'setting up the equations'
  const parts = [
    `${formatNumber(percent, 0)} %`,
    `${formatNumber(progress.iterations, 0)} iterations`,
    `residual ${formatNumber(progress.residual)}`,
  ]
  return [...parts, progress.phase ?? ''].filter(Boolean).join(' · ')
}

function stateWords(run: RunStatus): string {
  switch (run.state) {
    case 'queued':
      return 'waiting for a free thread'
    case 'running':
      return 'running'
    case 'done':
      return run.converged ? 'converged' : 'did not converge'
    case 'failed':
      return 'failed'
    case 'cancelled':
      return 'cancelled'
    case 'interrupted':
      return 'interrupted by a restart of the server: run it again'
  }
}

function stateColour(run: RunStatus): string {
  if (run.state === 'failed' || (run.state === 'done' && !run.converged)) return 'text-madder'
  if (run.state === 'interrupted' || run.state === 'cancelled') return 'text-ochre'
  return run.state === 'done' ? 'text-moss' : 'text-bourne'
}

const chart = { width: 240, height: 84, left: 34, right: 6, top: 6, bottom: 18 }

/** Residual against iterations, the residual on a logarithmic scale. */
function ResidualChart({ residuals, tolerance }: { residuals: readonly Residual[]; tolerance?: number }) {
  if (residuals.length < 2) return <div className="hidden sm:block" />
  const values = residuals.map((one) => Math.log10(one.residual))
  const goal = tolerance ? Math.log10(tolerance) : Math.min(...values)
  const high = Math.ceil(Math.max(...values, goal + 1))
  const low = Math.floor(Math.min(...values, goal))
  const most = residuals.at(-1)?.iterations ?? 1
  const x = (iterations: number) =>
    chart.left + (iterations / most) * (chart.width - chart.left - chart.right)
  const y = (log: number) =>
    chart.top + ((high - log) / (high - low)) * (chart.height - chart.top - chart.bottom)
  const path = residuals
    .map(
      (one, i) =>
        `${i === 0 ? 'M' : 'L'}${x(one.iterations).toFixed(1)} ${y(Math.log10(one.residual)).toFixed(1)}`,
    )
    .join('')
  const bottom = chart.height - chart.bottom
  return (
    <svg
      viewBox={`0 0 ${chart.width} ${chart.height}`}
      className="w-full max-w-60 text-flint-2"
      role="img"
      aria-label={`Residual against iterations: ${formatNumber(residuals.at(-1)?.residual)} after ${formatNumber(most, 0)} iterations`}
    >
      <path
        d={`M${chart.left} ${chart.top}V${bottom}H${chart.width - chart.right}`}
        fill="none"
        stroke="currentColor"
        strokeWidth="0.8"
      />
      {tolerance && (
        <path
          d={`M${chart.left} ${y(goal).toFixed(1)}H${chart.width - chart.right}`}
          stroke="var(--moss)"
          strokeDasharray="3 2"
          strokeWidth="1"
        />
      )}
      <path d={path} fill="none" stroke="var(--bourne)" strokeWidth="1.6" strokeLinejoin="round" />
      <g fill="currentColor" fontSize="9.5">
        <text x={chart.left - 4} y={chart.top + 7} textAnchor="end">
          {powerOfTen(high)}
        </text>
        <text x={chart.left - 4} y={bottom} textAnchor="end">
          {powerOfTen(low)}
        </text>
        <text x={chart.left} y={chart.height - 5}>
          residual
        </text>
        <text x={chart.width - chart.right} y={chart.height - 5} textAnchor="end">
          {formatNumber(most, 0)} iterations
        </text>
      </g>
    </svg>
  )
}

function powerOfTen(exponent: number): string {
  const digits = '⁰¹²³⁴⁵⁶⁷⁸⁹'
  return `10${[...String(exponent)].map((c) => (c === '-' ? '⁻' : digits[Number(c)])).join('')}`
}
