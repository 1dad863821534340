const words: Record<number, { title: string; text: string }> = {
  400: {
    title: 'That could not be read',
    text: 'Something in the request was not as expected. Nothing was changed.',
  },
  401: { title: 'Please sign in again', text: 'Your session has ended. What was saved is safe.' },
  403: { title: 'Your role may not do this', text: 'Ask the project manager if you need to.' },
  404: {
    title: 'There is nothing here',
    text: 'The address is wrong, or what it names is not yours to see.',
  },
  429: { title: 'Too many attempts', text: 'Wait a few minutes, then try again.' },
  500: {
    title: 'Something went wrong',
    text: 'The fault is ours and has been logged. What was saved is safe.',
  },
}

/** A whole page for a request that came to nothing. */
export function ErrorPage({ status, detail }: { status: number; detail?: string }) {
  const { title, text } = words[status] ?? { title: 'Something went wrong', text: 'Nothing was changed.' }
  return (
    <main className="mx-auto max-w-xl px-6 py-24">
      <title>{`${title} · Lavant`}</title>
      <p className="text-flint-2">{status}</p>
      <h1 className="mt-1 text-3xl font-semibold">{title}</h1>
      <p className="mt-4">{detail && detail !== 'null' ? detail : text}</p>
      <p className="mt-8">
        <a href="/projects" className="font-semibold">
          To the projects
        </a>
      </p>
    </main>
  )
}
