import { useRef, useState } from 'react'
import { href, Link, useNavigate, useRevalidator } from 'react-router'
import { Notice } from '~/components/notice'

const limit = 200 * 1024 * 1024

interface Sending {
  name: string
  bytes: number
  sent: number
  state: 'waiting' | 'sending' | 'stored' | 'refused'
  message?: string
  importId?: number
}

interface Answer {
  importId?: number
  error?: string
}

/** Sends one file as it is; the only way for a browser to say how far an upload has come. */
function send(url: string, file: File, onSent: (bytes: number) => void): Promise<Answer> {
  return new Promise((resolve) => {
    const request = new XMLHttpRequest()
    request.open('POST', url)
    request.setRequestHeader('Content-Type', 'application/octet-stream')
    request.setRequestHeader('X-File-Name', encodeURIComponent(file.name))
    request.setRequestHeader('Accept', 'application/json')
    request.upload.onprogress = (event) => onSent(event.loaded)
    request.onload = () => resolve(answerOf(request))
    request.onerror = () =>
      resolve({ error: 'The connection broke: nothing was stored. Choose the file again.' })
    request.send(file)
  })
}

function answerOf(request: XMLHttpRequest): Answer {
  try {
    return JSON.parse(request.responseText) as Answer
  } catch (error) {
    if (error instanceof SyntaxError)
      return { error: `The server answered ${request.status}: nothing was stored.` }
    throw error
  }
}

/** A place to drop files of readings, sent one after another. A single file leads straight to its import. */
export function Upload({ projectId }: { projectId: number }) {
  const [files, setFiles] = useState<readonly Sending[]>([])
  const [over, setOver] = useState(false)
  const input = useRef<HTMLInputElement>(null)
  const navigate = useNavigate()
  const revalidator = useRevalidator()
  const busy = files.some((file) => file.state === 'waiting' || file.state === 'sending')

  async function take(chosen: readonly File[]) {
    if (chosen.length === 0 || busy) return
    setFiles(chosen.map(({ name, size }) => ({ name, bytes: size, sent: 0, state: 'waiting' })))
    const update = (index: number, values: Partial<Sending>) =>
      setFiles((before) => before.map((file, i) => (i === index ? { ...file, ...values } : file)))
    let last: number | undefined
    for (const [index, file] of chosen.entries()) {
      const problem =
        file.size === 0
          ? 'The file is empty.'
          : file.size > limit
            ? `The file is larger than 200 MB: split it, by year say.`
            : null
      if (problem) {
        update(index, { state: 'refused', message: problem })
        continue
      }
      update(index, { state: 'sending' })
      const url = href('/projects/:projectId/readings/imports', { projectId: String(projectId) })
      const answer = await send(url, file, (sent) => update(index, { sent }))
      if (answer.importId === undefined) {
        update(index, { state: 'refused', message: answer.error ?? 'The file was not stored.' })
      } else {
        last = answer.importId
        update(index, { state: 'stored', sent: file.size, importId: answer.importId })
      }
    }
    if (chosen.length === 1 && last !== undefined) await navigate(importPath(projectId, last))
    else await revalidator.revalidate()
  }

  return (
    <div className="screen-only">
      {/* biome-ignore lint/a11y/noStaticElementInteractions: dropping is a shortcut for the button inside */}
      <div
        className={`flex flex-wrap items-center gap-x-4 gap-y-2 rounded border border-dashed px-4 py-4 ${
          over ? 'border-bourne bg-bourne-2' : 'border-flint-2 bg-chalk-2'
        }`}
        onDragOver={(event) => {
          event.preventDefault()
          setOver(true)
        }}
        onDragLeave={() => setOver(false)}
        onDrop={(event) => {
          event.preventDefault()
          setOver(false)
          void take([...event.dataTransfer.files])
        }}
      >
        <label className="inline-flex min-h-8 cursor-pointer items-center rounded border border-bourne bg-bourne px-3 py-1 font-semibold text-chalk focus-within:outline-2 focus-within:outline-offset-2 focus-within:outline-bourne hover:opacity-90">
          Choose files of readings
          <input
            ref={input}
            type="file"
            multiple
            disabled={busy}
            accept=".csv,.txt,.dat,.tsv,text/csv,text/plain"
            className="sr-only"
            onChange={(event) => {
              const chosen = [...(event.target.files ?? [])]
              event.target.value = ''
              void take(chosen)
            }}
          />
        </label>
        <p className="text-[0.93rem] text-flint-2">
          or drop them here. Text with columns (CSV), 200 MB at most. A file is kept exactly as it comes;
          nothing enters the readings before you have seen what it would do.
        </p>
      </div>
      {files.length > 0 && (
        <ul className="mt-2" aria-live="polite">
          {files.map((file, index) => (
            // biome-ignore lint/suspicious/noArrayIndexKey: two files may have one name, and the list never moves
            <li key={index}>
              <Sent file={file} projectId={projectId} />
            </li>
          ))}
        </ul>
      )}
    </div>
  )
}

function importPath(projectId: number, importId: number): string {
  return href('/projects/:projectId/readings/imports/:importId', {
    projectId: String(projectId),
    importId: String(importId),
  })
}

function Sent({ file, projectId }: { file: Sending; projectId: number }) {
  if (file.state === 'refused') {
    return (
      <Notice tone="alarm" title={`${file.name} was not taken.`}>
        {file.message}
      </Notice>
    )
  }
  const percent = file.bytes === 0 ? 0 : Math.min(100, Math.round((file.sent / file.bytes) * 100))
  return (
    <div className="my-1 grid grid-cols-[minmax(0,1fr)_8rem_7rem] items-center gap-3 text-[0.93rem]">
      <span className="truncate">{file.name}</span>
      <progress
        className="h-2 w-full accent-bourne"
        max={100}
        value={percent}
        aria-label={`Upload of ${file.name}`}
      />
      {file.importId === undefined ? (
        <span className="text-flint-2">{file.state === 'waiting' ? 'waiting' : `${percent} %`}</span>
      ) : (
        <Link to={importPath(projectId, file.importId)}>Read it</Link>
      )}
    </div>
  )
}
