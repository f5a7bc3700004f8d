/** One SQL text for the vault, printed from a plan, with the values it binds. Its columns are `keyCount` group keys, then `totalCount` integer totals. */
export interface VaultQuery {
  readonly text: string
  readonly values: readonly (string | null)[]
  readonly keyCount: number
  readonly totalCount: number
}
