import { readFileSync, statSync } from 'node:fs'

/** The account PostgreSQL runs under, where it is not our own. */
export interface ServerAccount {
  readonly uid: number
  readonly gid: number
}

/**
 * PostgreSQL refuses to run as root, so root hands it to whoever owns the data already, else to `nobody`.
 * Undefined where we are not root: the server then runs as we do.
 */
export function serverAccount(dataDirectory: string): ServerAccount | undefined {
  if (process.getuid?.() !== 0) return undefined
  const owner = statSync(dataDirectory, { throwIfNoEntry: false })
  if (owner !== undefined && owner.uid !== 0) return { uid: owner.uid, gid: owner.gid }
  return nobody()
}

function nobody(): ServerAccount {
  const line = accounts().find((row) => row.startsWith('nobody:'))
  const [, , uid, gid] = (line ?? '').split(':')
  return { uid: unsigned(uid) ?? 65534, gid: unsigned(gid) ?? 65534 }
}

function accounts(): readonly string[] {
  try {
    return readFileSync('/etc/passwd', 'utf8').split('\n')
  } catch {
    return []
  }
}

function unsigned(digits: string | undefined): number | undefined {
  return digits !== undefined && /^-?\d+$/.test(digits) ? Number(digits) >>> 0 : undefined
}
