import { watch } from 'node:fs'

/** Editors write a file in several steps: a change is told once this long after the last of them. */
const quietMs = 200

export interface PolicyWatch {
  close(): void
}

/** Calls `onChange` soon after a policy file in `directory` was written, renamed or removed; `onError` once where the directory can no longer be watched. */
export function watchPolicies(directory: string, onChange: () => void, onError: (code: string) => void): PolicyWatch {
  let timer: NodeJS.Timeout | null = null
  const watcher = watch(directory, { persistent: false }, (_event, name) => {
    if (name !== null && !/\.ya?ml$/.test(name)) return
    if (timer !== null) clearTimeout(timer)
    timer = setTimeout(onChange, quietMs)
    timer.unref()
  })
  const close = (): void => {
    if (timer !== null) clearTimeout(timer)
    watcher.close()
  }
  watcher.on('error', (error: NodeJS.ErrnoException) => {
    close()
    onError(error.code ?? 'unknown')
  })
  return { close }
}
