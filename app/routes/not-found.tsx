import { notFound } from '~/projects/guard.server'

export function loader() {
  throw notFound()
}

export function action() {
  throw notFound()
}

/** Never shown: the loader's answer is the error page. */
export default function NotFound() {
  return null
}
