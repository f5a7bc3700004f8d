import { createHash, createHmac, pbkdf2Sync, randomBytes, timingSafeEqual } from 'node:crypto'
import { Breach } from './breach.ts'

export const scramMechanism = 'SCRAM-SHA-256'
export const scramIterations = 4_096

/** What a server keeps of a password: RFC 5802 section 3, with SHA-256 by RFC 7677. */
export interface ScramKeys {
  readonly salt: Buffer
  readonly iterations: number
  readonly storedKey: Buffer
  readonly serverKey: Buffer
}

/** Where a salt comes from, and how often it is turned. */
export interface ScramSalt {
  readonly salt: Uint8Array
  readonly iterations: number
}

export function scramKeys(password: string, salt: Buffer = randomBytes(16), iterations = scramIterations): ScramKeys {
  const salted = pbkdf2Sync(password.normalize('NFKC'), salt, iterations, 32, 'sha256')
  return { salt, iterations, storedKey: sha256(hmac(salted, 'Client Key')), serverKey: hmac(salted, 'Server Key') }
}

/**
 * Keys that no password fits. The salt is the user's own where it is known, else one that stays the same for the name as long as `secret` does, so
 * that asking twice does not tell who exists.
 */
export function decoyKeys(secret: Uint8Array, user: string, known: ScramSalt | null): ScramKeys {
  return {
    salt: known === null ? hmac(secret, Buffer.from(user).toString('latin1')).subarray(0, 16) : Buffer.from(known.salt),
    iterations: known?.iterations ?? scramIterations,
    storedKey: randomBytes(32),
    serverKey: randomBytes(32),
  }
}

/** The server's side of one exchange, without channel binding: `first`, then `final`. Both throw Breach on a malformed message. */
export class ScramExchange {
  readonly #keys: ScramKeys
  readonly #serverNonce: string
  #binding = ''
  #nonce = ''
  #spoken = ''

  constructor(keys: ScramKeys, serverNonce = randomBytes(18).toString('base64')) {
    this.#keys = keys
    this.#serverNonce = serverNonce
  }

  first(message: Buffer): string {
    const text = plain(message)
    const parts = /^([ny]),([^,]*),(n=[^,]*,r=([\x21-\x2b\x2d-\x7e]+)(?:,.*)?)$/.exec(text)
    if (parts === null) throw malformed(/^p=/.test(text) ? 'Channel binding is not offered.' : 'Unexpected client-first-message.')
    const [, flag = '', authorization = '', bare = '', clientNonce = ''] = parts
    if (authorization !== '') throw new Breach('0A000', 'client uses authorization identity, but it is not supported')
    this.#binding = Buffer.from(`${flag},,`).toString('base64')
    this.#nonce = clientNonce + this.#serverNonce
    const reply = `r=${this.#nonce},s=${this.#keys.salt.toString('base64')},i=${this.#keys.iterations}`
    this.#spoken = `${bare},${reply}`
    return reply
  }

  /** The server's signature to send, or null where the proof is wrong. */
  final(message: Buffer): string | null {
    const text = plain(message)
    const parts = /^(c=([^,]*),r=([^,]*)(?:,[^p,]=[^,]*)*),p=([A-Za-z0-9+/=]+)$/.exec(text)
    if (parts === null) throw malformed('Unexpected client-final-message.')
    const [, withoutProof = '', binding = '', nonce = '', encoded = ''] = parts
    if (binding !== this.#binding) throw new Breach('08P01', 'unexpected SCRAM channel-binding attribute in client-final-message')
    if (nonce !== this.#nonce) throw malformed('Nonce does not match.')
    const proof = Buffer.from(encoded, 'base64')
    if (proof.length !== 32) throw malformed('Malformed proof in client-final-message.')
    const spoken = `${this.#spoken},${withoutProof}`
    const clientKey = xor(proof, hmac(this.#keys.storedKey, spoken))
    if (!timingSafeEqual(sha256(clientKey), this.#keys.storedKey)) return null
    return `v=${hmac(this.#keys.serverKey, spoken).toString('base64')}`
  }
}

function plain(message: Buffer): string {
  if (message.length === 0) throw malformed('The message is empty.')
  if (message.includes(0)) throw malformed('Message length does not match input length.')
  return message.toString('latin1')
}

function malformed(detail: string): Breach {
  return new Breach('08P01', 'malformed SCRAM message', detail)
}

function hmac(key: Uint8Array, text: string): Buffer {
  return createHmac('sha256', key).update(text, 'latin1').digest()
}

function sha256(bytes: Uint8Array): Buffer {
  return createHash('sha256').update(bytes).digest()
}

function xor(left: Buffer, right: Buffer): Buffer {
  return Buffer.from(left.map((byte, index) => byte ^ (right[index] ?? 0)))
}
