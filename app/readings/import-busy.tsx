import { useEffect, useState } from 'react'
import { href, useRevalidator } from 'react-router'
import type { Progress } from './preview.server'

interface State {
  state: string
  progress: Progress | null
}

const words: Record<Progress['step'], string> = {
  reading: 'Proving dates and numbers over the whole file',
  checking: 'Holding each row against instruments and readings',
  storing: 'Storing',
}

/** How far the thread has come; the page reads itself again when the import's state changes. */
export function ImportBusy({
  projectId,
  importId,
  state,
}: {
  projectId: number
  importId: number
  state: string
}) {
  const [progress, setProgress] = useState<Progress | null>(null)
  const { revalidate } = useRevalidator()
  useEffect(() => {
    const url = href('/projects/:projectId/readings/imports/:importId/state', {
      projectId: String(projectId),
      importId: String(importId),
    })
    let timer: ReturnType<typeof setTimeout>
    const stop = new AbortController()
    async function look() {
      try {
        const response = await fetch(url, { signal: stop.signal })
        if (response.ok) {
          const now = (await response.json()) as State
          setProgress(now.progress)
          if (now.state !== state) {
            await revalidate()
            return
          }
        }
      } catch (error) {
        // The server may be away for a moment: the next look tells.
        if (!(error instanceof TypeError)) {
          if (stop.signal.aborted) return
          throw error
        }
      }
      timer = setTimeout(look, 700)
    }
    timer = setTimeout(look, 250)
    return () => {
      stop.abort()
      clearTimeout(timer)
    }
  }, [projectId, importId, state, revalidate])

  const title = state === 'committing' ? 'The readings are being stored' : 'The file is being read'
  return (
    <div className="my-3 border-l-[3px] border-bourne bg-bourne-2/50 px-3 py-2" role="status">
      <p className="font-semibold">{title}</p>
      <progress
        className="my-1.5 h-2 w-full max-w-lg accent-bourne"
        max={100}
        value={progress?.percent ?? 0}
        aria-label={title}
      />
      <p className="text-[0.93rem] text-flint-2">
        {progress
          ? `${words[progress.step]}: ${progress.rows.toLocaleString('en-GB')} rows, ${progress.percent} %`
          : 'Waiting for a thread …'}{' '}
        You may leave this page; it goes on.
      </p>
    </div>
  )
}
