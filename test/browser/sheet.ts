import type { Locator, Page } from 'playwright-core'

/** A sheet of the calc book, worked as a person works it: cells found by the name in their row and by column. */
export function sheetOf(page: Page, label: string) {
  const section = page.getByRole('region', { name: label, exact: true })

  async function rowId(name: string): Promise<string> {
    const row = section.locator('[role=row]').filter({
      has: page.locator('[role=gridcell][col-id="name"]').getByText(name, { exact: true }),
    })
    const id = await row.getAttribute('row-id')
    if (!id) throw new Error(`${label} has no row ${name}.`)
    return id
  }

  async function cell(name: string, field: string): Promise<Locator> {
    return section.locator(`[row-id="${await rowId(name)}"] [col-id="${field}"]`)
  }

  return {
    section,
    cell,
    add: (noun: string) => section.getByRole('button', { name: `Add ${noun}` }).click(),
    /** Types into the cell under edit, then leaves it by the key. */
    async fill(field: string, text: string, key: 'Tab' | 'Enter'): Promise<void> {
      const editor = section.locator(`.ag-cell-inline-editing[col-id="${field}"] input`)
      await editor.fill(text)
      await editor.press(key)
    },
    /** Opens a cell, types and presses Enter. */
    async type(name: string, field: string, text: string): Promise<void> {
      const place = await cell(name, field)
      await place.dblclick()
      await place.locator('input').fill(text)
      await place.locator('input').press('Enter')
    },
  }
}

/** Waits until what was just typed is saved, and returns the server's status. Call before typing. */
export async function rowsSaved(page: Page, type: () => Promise<void>): Promise<number> {
  const answered = page.waitForResponse(
    (response) =>
      response.request().method() === 'POST' && new URL(response.url()).pathname.endsWith('/rows'),
  )
  await type()
  return (await answered).status()
}
