import { open, realpath, rename, rm, stat } from 'node:fs/promises'
import { basename, dirname, join } from 'node:path'

/** Puts `text` in a file's place all at once: a reader sees the old text or the new one, also after a crash. Mode and, for root, owner are kept; a symbolic link stays one. */
export async function replaceFile(file: string, text: string): Promise<void> {
  const target = await realpath(file)
  const before = await stat(target)
  const fresh = join(dirname(target), `.${basename(target)}.${process.pid}.new`)
  try {
    const handle = await open(fresh, 'wx', before.mode & 0o777)
    try {
      await handle.writeFile(text, 'utf8')
      await handle.chmod(before.mode & 0o777)
      if (process.getuid?.() === 0) await handle.chown(before.uid, before.gid)
      await handle.sync()
    } finally {
      await handle.close()
    }
    await rename(fresh, target)
  } catch (error) {
    await rm(fresh, { force: true })
    throw error
  }
}
