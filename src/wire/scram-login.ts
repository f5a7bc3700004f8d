import type { Socket } from 'node:net'
import { Breach } from './breach.ts'
import type { ByteReader } from './byte-reader.ts'
import { authenticationContinue, authenticationSasl, readSaslInitial } from './messages.ts'
import { ScramExchange, scramMechanism, type ScramKeys } from './scram.ts'

/** What every log-in that fails is told, whoever it was: PostgreSQL's words for a wrong password. */
export function wrongPassword(user: string): Breach {
  return new Breach('28P01', `password authentication failed for user "${user}"`)
}

/** The server's side of a SCRAM log-in. Resolves with the last message's signature, or null where the password is wrong. */
export async function scramLogin(socket: Socket, reader: ByteReader, keys: ScramKeys, ceiling: number): Promise<string | null> {
  const exchange = new ScramExchange(keys)
  socket.write(authenticationSasl(scramMechanism))
  const initial = readSaslInitial((await reader.frame(ceiling, 'p')).body)
  if (initial === null) throw new Breach('08P01', 'malformed SCRAM message', 'The message is cut short.')
  if (initial.mechanism !== scramMechanism) throw new Breach('08P01', 'client selected an invalid SASL authentication mechanism')
  socket.write(authenticationContinue(exchange.first(initial.data)))
  return exchange.final((await reader.frame(ceiling, 'p')).body)
}
