import {
  isRouteErrorResponse,
  Links,
  Meta,
  Outlet,
  Scripts,
  ScrollRestoration,
  useRouteLoaderData,
} from 'react-router'
import type { Route } from './+types/root'
import { ErrorPage } from './components/error-page'
import { useNonce } from './components/nonce'
import { newNonce, nonceContext } from './nonce.server'
import { themeOf } from './theme.server'
import '../tailwind.css'

export const middleware: Route.MiddlewareFunction[] = [
  async ({ context }, next) => {
    context.set(nonceContext, newNonce())
    return next()
  },
]

export async function loader({ request }: Route.LoaderArgs) {
  return { theme: await themeOf(request) }
}

export function links(): Route.LinkDescriptors {
  return [{ rel: 'icon', href: '/mark.svg', type: 'image/svg+xml' }]
}

export function Layout({ children }: { children: React.ReactNode }) {
  const nonce = useNonce()
  const data = useRouteLoaderData<typeof loader>('root')
  return (
    <html lang="en" data-theme={data?.theme === 'system' ? undefined : data?.theme}>
      <head>
        <meta charSet="utf-8" />
        <meta name="viewport" content="width=device-width, initial-scale=1" />
        <Meta />
        <Links nonce={nonce} />
      </head>
      <body className="bg-chalk font-sans text-flint antialiased">
        {children}
        <ScrollRestoration nonce={nonce} />
        <Scripts nonce={nonce} />
      </body>
    </html>
  )
}

export default function Root() {
  return <Outlet />
}

export function ErrorBoundary({ error }: Route.ErrorBoundaryProps) {
  if (isRouteErrorResponse(error)) {
    return (
      <ErrorPage status={error.status} detail={typeof error.data === 'string' ? error.data : undefined} />
    )
  }
  return <ErrorPage status={500} />
}
