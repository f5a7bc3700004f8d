/** What the session asks for beyond the policy: tighter bounds only. */
export interface Limits {
  readonly groups: bigint | null
  readonly rows: bigint | null
}

export const noLimits: Limits = { groups: null, rows: null }
