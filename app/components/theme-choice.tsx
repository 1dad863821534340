import { Form } from 'react-router'
import { Button } from './button'

const names = { light: 'Light', dark: 'Dark', system: 'As the system' } as const

/** Which colours a person wants; the choice is kept in a cookie. */
export function ThemeChoice({ action, chosen }: { action: string; chosen: keyof typeof names }) {
  return (
    <Form method="post" action={action} navigate={false} aria-label="Colours" className="flex gap-1.5">
      {(['light', 'dark', 'system'] as const).map((theme) => (
        <Button
          key={theme}
          type="submit"
          name="theme"
          value={theme}
          look={theme === chosen ? 'chosen' : 'quiet'}
          aria-pressed={theme === chosen}
        >
          {names[theme]}
        </Button>
      ))}
    </Form>
  )
}
