import type pg from 'pg'
import { literal } from './quote.ts'
import { sqlstateOf } from './session.ts'

/** Sets `settings` on a role or database (`target`: 'ROLE ana', 'DATABASE ferries', names quoted). What the lobby's role may not set is warned of. Inside a transaction. */
export async function setOn(
  client: pg.Client,
  target: string,
  settings: readonly (readonly [name: string, value: string])[],
  superuser: boolean,
  warn: (text: string) => void,
): Promise<void> {
  const texts = settings.map(([setting, value]) => [setting, `ALTER ${target} SET ${setting} = ${literal(value)}`] as const)
  if (superuser) {
    await client.query(texts.map(([, text]) => text).join('; '))
    return
  }
  for (const [setting, text] of texts) {
    await client.query('SAVEPOINT one_setting')
    try {
      await client.query(`${text}; RELEASE SAVEPOINT one_setting`)
    } catch (error) {
      await client.query('ROLLBACK TO SAVEPOINT one_setting')
      if (sqlstateOf(error) !== '42501') throw error
      warn(`${setting} could not be set in the lobby: have a superuser run GRANT SET ON PARAMETER ${setting} to the lobby's role`)
    }
  }
}
