/** Text in a client's encoding, there and back: `encode(decode(bytes))` are the same bytes. */
export interface TextCodec {
  /** Null where the bytes are not text of this encoding. */
  decode(bytes: Uint8Array): string | null
  /** What the encoding lacks becomes a question mark. */
  encode(text: string): Buffer
}

/** PostgreSQL's names of encodings with one byte a character, and what TextDecoder calls them. */
const oneByte: Readonly<Record<string, string>> = {
  LATIN2: 'iso-8859-2',
  LATIN3: 'iso-8859-3',
  LATIN4: 'iso-8859-4',
  LATIN5: 'iso-8859-9',
  LATIN6: 'iso-8859-10',
  LATIN7: 'iso-8859-13',
  LATIN8: 'iso-8859-14',
  LATIN9: 'iso-8859-15',
  LATIN10: 'iso-8859-16',
  ISO_8859_5: 'iso-8859-5',
  ISO_8859_6: 'iso-8859-6',
  ISO_8859_7: 'iso-8859-7',
  ISO_8859_8: 'iso-8859-8',
  KOI8R: 'koi8-r',
  KOI8U: 'koi8-u',
  WIN866: 'ibm866',
  WIN874: 'windows-874',
  WIN1250: 'windows-1250',
  WIN1251: 'windows-1251',
  WIN1252: 'windows-1252',
  WIN1253: 'windows-1253',
  WIN1254: 'windows-1254',
  WIN1255: 'windows-1255',
  WIN1256: 'windows-1256',
  WIN1257: 'windows-1257',
  WIN1258: 'windows-1258',
}

const utf8: TextCodec = {
  decode(bytes) {
    try {
      return new TextDecoder('utf-8', { fatal: true, ignoreBOM: true }).decode(bytes)
    } catch {
      return null
    }
  },
  encode: (text) => Buffer.from(text, 'utf8'),
}

/** ISO 8859-1 to the letter; TextDecoder's namesake is windows-1252. */
const latin1: TextCodec = {
  decode: (bytes) => Buffer.from(bytes).toString('latin1'),
  encode: (text) => Buffer.from(Array.from(text, (character) => ((character.codePointAt(0) ?? 0) < 0x100 ? character : '?')).join(''), 'latin1'),
}

/** For the encodings of several bytes that cannot be written here: text in ASCII passes, other text is none. */
const ascii: TextCodec = {
  decode: (bytes) => (bytes.some((byte) => byte >= 0x80) ? null : Buffer.from(bytes).toString('latin1')),
  encode: (text) => Buffer.from(Array.from(text, (character) => (character < '\x80' ? character : '?')).join(''), 'latin1'),
}

const made = new Map<string, TextCodec>()

/** The codec of a `client_encoding`. SQL_ASCII means that PostgreSQL converts nothing, and its databases here are UTF-8. */
export function codecOf(clientEncoding: string): TextCodec {
  if (clientEncoding === 'UTF8' || clientEncoding === 'SQL_ASCII') return utf8
  if (clientEncoding === 'LATIN1') return latin1
  const label = oneByte[clientEncoding]
  if (label === undefined) return ascii
  const known = made.get(label) ?? tableCodec(label)
  made.set(label, known)
  return known
}

/** Whether text beyond ASCII can be read and written in this encoding. */
export function isSpoken(clientEncoding: string): boolean {
  return codecOf(clientEncoding) !== ascii
}

// Node 20 reads windows-1252 as ISO 8859-1: the block in which they differ is here.
const win1252 =
  '\u20ac\x81\u201a\u0192\u201e\u2026\u2020\u2021\u02c6\u2030\u0160\u2039\u0152\x8d\u017d\x8f\x90\u2018\u2019\u201c\u201d\u2022\u2013\u2014\u02dc\u2122\u0161\u203a\u0153\x9d\u017e\u0178'

function tableCodec(label: string): TextCodec {
  const decoder = new TextDecoder(label)
  const characters = Array.from({ length: 256 }, (_, byte) =>
    label === 'windows-1252' && byte >= 0x80 && byte < 0xa0 ? win1252.charAt(byte - 0x80) : decoder.decode(Uint8Array.of(byte)),
  )
  const bytes = new Map(characters.map((character, byte) => [character, byte]))
  bytes.delete('\ufffd')
  return {
    decode(source) {
      const text = Array.from(source, (byte) => characters[byte] ?? '\ufffd').join('')
      return text.includes('\ufffd') ? null : text
    },
    encode: (text) => Buffer.from(Array.from(text, (character) => bytes.get(character) ?? 0x3f)),
  }
}
