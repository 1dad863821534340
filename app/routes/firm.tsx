import { Form, href, Link, NavLink, Outlet } from 'react-router'
import { requireSignIn, signedInContext } from '~/sign-in/guard.server'
import type { Route } from './+types/firm'

export const middleware: Route.MiddlewareFunction[] = [requireSignIn]

export async function loader({ context }: Route.LoaderArgs) {
  const { name, isAdministrator } = context.get(signedInContext)
  return { name, isAdministrator }
}

const link =
  'border-b-2 border-transparent px-1 py-3 text-flint hover:border-rule hover:no-underline aria-[current=page]:border-bourne aria-[current=page]:font-semibold'

export default function Firm({ loaderData }: Route.ComponentProps) {
  return (
    <div className="flex min-h-dvh flex-col">
      <a href="#work" className="absolute -left-[999px] z-50 bg-chalk p-2 focus:top-2 focus:left-2">
        Skip to the work
      </a>
      <header className="screen-only border-b-[1.5px] border-flint bg-chalk-2">
        <div className="mx-auto flex max-w-6xl flex-wrap items-center gap-x-6 px-4">
          <Link
            to={href('/projects')}
            className="py-2 text-[1.27rem] font-bold tracking-[0.02em] text-flint hover:no-underline"
          >
            Lavant
          </Link>
          <nav aria-label="The firm" className="flex flex-1 gap-4">
            <NavLink to={href('/projects')} className={link}>
              Projects
            </NavLink>
            {loaderData.isAdministrator && (
              <NavLink to={href('/people')} className={link}>
                People
              </NavLink>
            )}
            <NavLink to={href('/account')} className={link}>
              Account
            </NavLink>
          </nav>
          <div className="flex items-center gap-4 py-2 text-[0.93rem]">
            <span>
              {loaderData.name}
              {loaderData.isAdministrator && <span className="text-flint-2">, administrator</span>}
            </span>
            <Form method="post" action={href('/sign-out')} reloadDocument>
              <button type="submit" className="text-bourne hover:underline">
                Sign out
              </button>
            </Form>
          </div>
        </div>
      </header>
      <main id="work" className="mx-auto w-full max-w-6xl flex-1 px-4 pt-6 pb-16">
        <Outlet />
      </main>
    </div>
  )
}
