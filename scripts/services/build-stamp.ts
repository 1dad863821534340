import { createHash } from 'node:crypto'
import { existsSync, readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs'
import { join } from 'node:path'

/** What the build is made from, besides configuration files at the root. */
const folders = ['app', 'database', 'public']

function stampFile(root: string): string {
  return join(root, 'build/sources.sha256')
}

/** SHA-256 over the paths and bytes of everything that goes into the build. */
export function sourcesHash(root: string): string {
  const inFolders = folders
    .filter((folder) => existsSync(join(root, folder)))
    .flatMap((folder) =>
      readdirSync(join(root, folder), { recursive: true, encoding: 'utf8' }).map((path) =>
        join(folder, path),
      ),
    )
    .filter((path) => !/\.test\.tsx?$/.test(path) && statSync(join(root, path)).isFile())
  const atRoot = readdirSync(root).filter((name) =>
    /\.(config\.ts|css)$|^tsconfig\.json$|^package-lock\.json$/.test(name),
  )
  const hash = createHash('sha256')
  for (const path of [...inFolders, ...atRoot].sort()) {
    hash
      .update(`${path}\0`)
      .update(readFileSync(join(root, path)))
      .update('\0')
  }
  return hash.digest('hex')
}

/** Whether the build was made, to its end, from the sources as they are now. */
export function isBuildCurrent(root: string): boolean {
  const stamp = stampFile(root)
  return existsSync(stamp) && readFileSync(stamp, 'utf8').trim() === sourcesHash(root)
}

/** Marks the build as finished; `hash` is that of the sources before it began. */
export function stampBuild(root: string, hash: string): void {
  writeFileSync(stampFile(root), `${hash}\n`)
}
