import { authenticationFinal, authenticationOk, cString, frame, int32, parameterStatus, readyForQuery } from './messages.ts'
import type { Opening } from './greet.ts'
import { decoyKeys, type ScramKeys } from './scram.ts'
import { scramLogin, wrongPassword } from './scram-login.ts'

/** Who may come in, and what they are told of the session. */
export interface PullLogin {
  readonly user: string
  readonly keys: ScramKeys
  readonly decoySecret: Uint8Array
  readonly ceiling: number
  /** Process number and cancel key. */
  readonly key: Buffer
}

const database = 'pull'

/** What libpq and dblink look at. */
const parameters = {
  server_version: '18.0',
  server_encoding: 'UTF8',
  client_encoding: 'UTF8',
  DateStyle: 'ISO, MDY',
  IntervalStyle: 'postgres',
  TimeZone: 'UTC',
  integer_datetimes: 'on',
  standard_conforming_strings: 'on',
  is_superuser: 'off',
}

/** Takes a connection from its StartupMessage to ReadyForQuery; throws Breach for a wrong password, user or database, all alike. */
export async function admitPuller(opening: Opening & { readonly kind: 'startup' }, login: PullLogin): Promise<void> {
  const { socket, reader, startup } = opening
  const { minor, protocolOptions } = startup
  if (minor > 0 || protocolOptions.length > 0) {
    socket.write(frame('v', int32(196_608), int32(protocolOptions.length), ...protocolOptions.map(cString)))
  }
  const known = startup.user === login.user && startup.database === database
  const user = startup.user ?? ''
  const signature = await scramLogin(socket, reader, known ? login.keys : decoyKeys(login.decoySecret, user, null), login.ceiling)
  if (signature === null) throw wrongPassword(user)
  socket.write(
    Buffer.concat([
      authenticationFinal(signature),
      authenticationOk,
      ...Object.entries(parameters).map(([name, value]) => parameterStatus(name, value)),
      frame('K', login.key),
      readyForQuery('I'),
    ]),
  )
}
