import { execFileSync } from 'node:child_process'
import { existsSync, readFileSync } from 'node:fs'
import path from 'node:path'
import { fileURLToPath } from 'node:url'

export const projectDir = path.resolve(fileURLToPath(new URL('../..', import.meta.url)))

/** Paths below the project of every file that git tracks or would add. */
export function projectFiles(): string[] {
  const listed = execFileSync(
    'git',
    ['-c', 'safe.directory=*', 'ls-files', '--cached', '--others', '--exclude-standard', '-z'],
    {
      cwd: projectDir,
      encoding: 'utf8',
    },
  )
  return [...new Set(listed.split('\0'))]
    .filter((file) => file !== '' && existsSync(path.join(projectDir, file)))
    .sort()
}

export const contentOf = (file: string): string => readFileSync(path.join(projectDir, file), 'utf8')

export interface Import {
  /** Path below the project of the file that imports. */
  from: string
  /** As written: './x.ts', 'knex', 'node:fs'. */
  wanted: string
  /** Path below the project, for a relative import. */
  target?: string
  /** Only types: gone at run time. */
  typeOnly: boolean
}

const STATEMENT =
  /(?:^|[\s;}])(?:(import|export)\s+(type\s+)?(?:[\w$*{},\s]+?\s+from\s+)?|import\s*\(\s*)(['"])([^'"\n]+)\3/g

/** The imports of one source text; comments are taken out first, so that an example in one is not an import. */
export function importsIn(file: string, text: string): Import[] {
  const code = scriptOf(file, text)
    .replace(/\/\*[\s\S]*?\*\//g, '')
    .replace(/^\s*\/\/.*$/gm, '')
  return [...code.matchAll(STATEMENT)].map((match) => {
    const wanted = match[4] ?? ''
    const relative = wanted.startsWith('.')
    return {
      from: file,
      wanted,
      typeOnly: match[2] !== undefined,
      ...(relative ? { target: path.posix.join(path.posix.dirname(file), wanted) } : {}),
    }
  })
}

function scriptOf(file: string, text: string): string {
  if (!file.endsWith('.vue')) return text
  return [...text.matchAll(/<script[^>]*>([\s\S]*?)<\/script>/g)].map((match) => match[1]).join('\n')
}

/** Every import of the program's own source files, tests left out. */
export function allImports(): Import[] {
  return projectFiles()
    .filter((file) => /^(src|server|simulator|db)\/.*\.(ts|js|vue)$/.test(file))
    .flatMap((file) => importsIn(file, contentOf(file)))
}
