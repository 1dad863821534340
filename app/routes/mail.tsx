import { useEffect } from 'react'
import { href, Link, useRevalidator } from 'react-router'
import { Letterhead } from '~/components/letterhead'
import { environment } from '~/environment.server'
import { readMailbox } from '~/mail/mailbox.server'
import { notFound } from '~/projects/guard.server'
import type { Route } from './+types/mail'

/** In production there is no such page: the codes of everybody stand here. */
export async function loader() {
  const { mode, mailbox } = environment()
  if (mode !== 'demo' || !mailbox) throw notFound()
  return { mails: await readMailbox(mailbox) }
}

const time = new Intl.DateTimeFormat('en-GB', { dateStyle: 'medium', timeStyle: 'medium', timeZone: 'UTC' })

export default function Mail({ loaderData }: Route.ComponentProps) {
  const { revalidate, state } = useRevalidator()
  useEffect(() => {
    const timer = setInterval(() => {
      if (state === 'idle' && document.visibilityState === 'visible') void revalidate()
    }, 3000)
    return () => clearInterval(timer)
  }, [revalidate, state])
  return (
    <Letterhead title="Received mail">
      <p className="mb-5 text-flint-2">
        The demo sends no mail to anybody: everything that it would send arrives here, the newest first.{' '}
        <Link to={href('/sign-in')} className="underline">
          To the sign-in
        </Link>
      </p>
      {loaderData.mails.length === 0 && (
        <p className="border border-rule bg-chalk-2 px-3 py-2.5 text-flint-2">No mail has come yet.</p>
      )}
      <ol>
        {loaderData.mails.map((mail, index) => (
          <li key={mail.id} className="border-t border-rule py-3">
            <article>
              <h2 className={`text-[1.1rem] ${index === 0 ? 'font-semibold' : ''}`}>{mail.subject}</h2>
              <p className="text-[0.9rem] break-words text-flint-2">
                to {mail.to.join(', ')}, <time dateTime={mail.at}>{time.format(new Date(mail.at))} UTC</time>
              </p>
              <p className="mt-2 max-w-prose break-words whitespace-pre-wrap">{mail.text}</p>
            </article>
          </li>
        ))}
      </ol>
    </Letterhead>
  )
}
