/**
 * The page to go to after sign-in, from the address bar: only ever a path of this site, '/' for anything else.
 * Parsed as a browser would, since '/\host', '/.//host' and a tab in the middle all lead elsewhere.
 */
export function nextPage(text: string | null | undefined): string {
  if (!text?.startsWith('/')) return '/'
  const base = 'http://this-site.invalid'
  const url = URL.parse(text, base)
  if (!url || url.origin !== base || url.pathname.startsWith('//')) return '/'
  if (/^\/sign-(in|out)(\/|$)/.test(url.pathname)) return '/'
  return url.pathname + url.search + url.hash
}
