import { spawn } from 'node:child_process'
import type { Socket } from 'node:net'
import type { ServerAccount } from './account.ts'
import { serverEnvironment } from './data-directory.ts'

/** Watches that a server does not outlive us. */
export interface Guard {
  /** The server has ended: nothing is left to watch. */
  dismiss(): void
}

/** Reads until the pipe from us ends. Without a word before, we are gone, however that came: the server is shut down, at once if it takes more than 10 s. */
const script = `
trap '' INT TERM HUP
read -r word
[ "$word" = dismissed ] && exit 0
kill -INT "$1"
i=0
while kill -0 "$1" 2>/dev/null; do
  [ $i -eq 50 ] && kill -QUIT "$1"
  [ $i -eq 100 ] && exit 1
  i=$((i + 1))
  sleep 0.2
done
`

/**
 * INVARIANT GUARDED: a server ends when the process that started it does, by whatever signal. A small shell holds the other end of a pipe; the system closes ours when we are gone.
 * It leads a session of its own, so that a Ctrl-C meant for us does not reach it.
 */
export function guardServer(pid: number, account: ServerAccount | undefined): Guard {
  const shell = spawn('/bin/sh', ['-c', script, 'hedgerow-guard', String(pid)], {
    cwd: '/',
    env: serverEnvironment,
    ...account,
    detached: true,
    stdio: ['pipe', 'ignore', 'ignore'],
  })
  const line = shell.stdin as Socket
  line.on('error', () => undefined)
  shell.on('error', () => undefined)
  shell.unref()
  line.unref()
  return { dismiss: () => void line.end('dismissed\n') }
}
