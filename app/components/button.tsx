import type { ComponentProps } from 'react'
import { Link, type LinkProps } from 'react-router'

const looks = {
  primary: 'border-bourne bg-bourne text-chalk font-semibold hover:opacity-90',
  plain: 'border-rule bg-chalk text-flint hover:bg-chalk-2',
  quiet: 'border-transparent bg-chalk-2 text-flint hover:bg-chalk-3',
  chosen: 'border-transparent bg-bourne-2 text-bourne font-semibold',
  danger: 'border-madder bg-chalk text-madder font-semibold hover:bg-madder-2',
} as const

export type ButtonLook = keyof typeof looks

function classes(look: ButtonLook, extra?: string): string {
  return `inline-flex min-h-8 items-center justify-center gap-1.5 rounded border px-3 py-1 text-[0.95rem] no-underline hover:no-underline disabled:opacity-50 ${looks[look]} ${extra ?? ''}`
}

export function Button({
  look = 'plain',
  className,
  type = 'button',
  ...rest
}: ComponentProps<'button'> & { look?: ButtonLook }) {
  return <button type={type} className={classes(look, className)} {...rest} />
}

export function LinkButton({ look = 'plain', className, ...rest }: LinkProps & { look?: ButtonLook }) {
  return <Link className={classes(look, className as string)} {...rest} />
}

/** A link that leaves the router: a download. */
export function DownloadButton({
  look = 'quiet',
  className,
  ...rest
}: ComponentProps<'a'> & { look?: ButtonLook }) {
  return <a className={classes(look, className)} {...rest} />
}
