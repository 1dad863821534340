import { createCookie } from 'react-router'
import { environment } from './environment.server'

export const themes = ['light', 'dark', 'system'] as const
export type Theme = (typeof themes)[number]

/** Which of light, dark or the system's own the person chose; no secret, so unsigned. */
export const themeCookie = createCookie('theme', {
  path: '/',
  sameSite: 'lax',
  httpOnly: true,
  secure: environment().address.startsWith('https:'),
  maxAge: 365 * 86_400,
})

export async function themeOf(request: Request): Promise<Theme> {
  const value: unknown = await themeCookie.parse(request.headers.get('Cookie'))
  return themes.find((theme) => theme === value) ?? 'system'
}
