export type Prepared = { readonly kind: 'prepared'; readonly password: string } | { readonly kind: 'unfit'; readonly why: string }

/** Code points that RFC 3454 maps to nothing (table B.1). */
const mappedToNothing = /\u034f|[\u180b-\u180d]|[\ufe00-\ufe0f]|[\u00ad\u1806\u200b-\u200d\u2060\ufeff]/gu
/** Spaces other than ASCII's (table C.1.2), which become one. */
const otherSpaces = /[\u00a0\u1680\u2000-\u200a\u202f\u205f\u3000]/gu
/** Tables C.2.1 to C.9: control, private use, surrogate, not for plain text, not for canonical form, changing display, tags; and code points without a character. */
const prohibited =
  /\u0340|\u0341|[\p{Cc}\p{Co}\p{Cs}\p{Cn}\u06dd\u070f\u180e\u200e\u200f\u2028-\u202e\u2061-\u2063\u206a-\u206f\u2ff0-\u2ffb\ufff9-\ufffd\u{1d173}-\u{1d17a}\u{e0001}\u{e0020}-\u{e007f}]/u
/** Scripts whose letters every implementation of SASLprep knows and treats alike. */
const settled =
  /^[\p{Script=Latin}\p{Script=Greek}\p{Script=Cyrillic}\p{Script=Han}\p{Script=Hiragana}\p{Script=Katakana}\p{Script=Hangul}\p{Mn}\p{Nd}\p{P}\p{S}\p{Z}]*$/u

const leastLength = 8
const mostLength = 512

/**
 * A password as SASLprep (RFC 4013) prepares it, which is what PostgreSQL and its clients hash: special spaces become plain ones, soft hyphens and their like fall away,
 * then NFKC; control and unassigned characters are refused. Unicode 3.2's tables of unassigned code points and the check of mixed writing directions are not
 * reproduced: servers hash such a password as it was typed, so one that preparation would *change* is refused where it holds characters outside the common scripts.
 */
export function preparedPassword(typed: string): Prepared {
  if (typed.length > mostLength) return { kind: 'unfit', why: `the password is longer than ${mostLength} characters` }
  const mapped = typed.replace(otherSpaces, ' ').replace(mappedToNothing, '')
  const password = mapped.normalize('NFKC')
  if (password === '') return { kind: 'unfit', why: 'the password is empty' }
  if (prohibited.test(password)) return { kind: 'unfit', why: 'the password holds a control character or a character that cannot be typed alike everywhere' }
  if (password !== typed && (!settled.test(mapped) || /[\u{10000}-\u{10ffff}]/u.test(mapped)))
    return { kind: 'unfit', why: 'the password holds characters that clients may prepare in different ways' }
  return { kind: 'prepared', password }
}

/** Whether a password is too short to withstand guessing by whoever comes by its verifier. */
export function isShort(password: string): boolean {
  return [...password].length < leastLength
}
