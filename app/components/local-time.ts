/** Days and times of the site, in its own time zone, the same on server and page. */
export function localTime(timeZone: string) {
  return {
    /** 24 Nov 2026 */
    day: (iso: string) =>
      new Intl.DateTimeFormat('en-GB', { day: 'numeric', month: 'short', year: 'numeric', timeZone }).format(
        new Date(iso),
      ),
    /** 24 Nov 2026, 16:08 */
    minute: (iso: string) =>
      new Intl.DateTimeFormat('en-GB', {
        day: 'numeric',
        month: 'short',
        year: 'numeric',
        hour: '2-digit',
        minute: '2-digit',
        timeZone,
      }).format(new Date(iso)),
  }
}
