export interface RefusalRow {
  /** 42501 what privacy forbids or a spent budget; 42803 a missing aggregate; 22023 a bad setting; 54001, 42601 and the like where PostgreSQL itself would say so. */
  readonly sqlstate: string
  /** Lower case, no final period; `{name}` is filled with facts. */
  readonly message: string
  /** Ends in SQL that works, or in who can help. */
  readonly hint: string
  /** One line for the README: why. */
  readonly why: string
}

/** Every code a statement can be refused with. The README lists the same codes; a test holds both to each other. */
export const refusals = {
  'text.too-long': {
    sqlstate: '54000',
    message: 'a statement over private tables may be {ceiling} bytes long, this one has {length}',
    hint: 'Split it, or put long lists into a temporary table and join it to the finished result.',
    why: 'reading a statement costs memory in proportion to its length',
  },
  'text.too-deep': {
    sqlstate: '54001',
    message: 'the statement nests too deeply to be read',
    hint: 'Write the same condition flatter, for example with IN or = ANY (ARRAY[…]) instead of nested parentheses.',
    why: 'the parser has a fixed stack',
  },
  'text.too-slow': {
    sqlstate: '54000',
    message: 'the statement took too long to read',
    hint: 'Send it again; where that does not help, write it shorter, for example with IN or = ANY (ARRAY[…]) instead of a long chain of conditions.',
    why: 'one statement must not keep the parser from the others',
  },
  'text.unreadable': {
    sqlstate: '42601',
    message: 'this form of {what} cannot be read over private tables',
    hint: 'Leave it out, or apply it to the finished result: SELECT answer.* FROM ({example}) AS answer',
    why: 'what is not understood in full is not answered',
  },
  'text.backslash': {
    sqlstate: '42601',
    message: 'a statement over private tables with a backslash in it cannot be read while standard_conforming_strings is off',
    hint: "SET standard_conforming_strings = on, and write E'…' where a backslash is to escape",
    why: 'one text with two readings must not be guessed at',
  },
  'rows.private': {
    sqlstate: '42501',
    message: 'rows of "{table}" are about persons and are not shown',
    hint: 'Ask for an aggregate instead: {example}',
    why: 'a row about a person leaves the vault only inside a noisy total',
  },
  'rows.person': {
    sqlstate: '42501',
    message: 'column "{column}" says whose row it is and cannot be shown or grouped by',
    hint: 'Count persons instead: {example}',
    why: 'a person’s key in an answer would name the person',
  },
  'rows.window': {
    sqlstate: '42501',
    message: 'a window function over rows of "{table}" would set one person’s rows against another’s',
    hint: 'Aggregate first and put the window over the finished groups: {example}',
    why: 'one person’s rows would change another’s value without bound',
  },
  'rows.locked': {
    sqlstate: '42501',
    message: '{what} cannot be used on the private table "{table}"',
    hint: 'The rows stay in the vault. Ask for an aggregate: {example}',
    why: 'analysts read aggregates; nothing they do may touch or reveal rows',
  },
  'rows.shadow': {
    sqlstate: '42501',
    message: 'the name "{table}" belongs to a private table',
    hint: 'Choose another name, for example CREATE TEMP TABLE answer AS {example}',
    why: 'one name with two meanings would be charged for by mistake',
  },
  'block.ungrouped': {
    sqlstate: '42803',
    message: 'column "{column}" must appear in the GROUP BY clause or be used in an aggregate function',
    hint: 'Group by it: {example}',
    why: 'PostgreSQL’s own rule',
  },
  'block.aggregate': {
    sqlstate: '42501',
    message: 'the aggregate {what} is not answered over private rows',
    hint: 'count(*), count(column), count(DISTINCT {person}), sum, avg, variance and stddev are, each with FILTER and WHERE: {example}',
    why: 'each aggregate needs a proved bound on what one person can change',
  },
  'block.shape': {
    sqlstate: '42501',
    message: '{what} is not answered over private rows',
    hint: 'Write one SELECT of aggregates over the tables, joined on the person, with WHERE and GROUP BY, and apply the rest to its result: {example}',
    why: 'only shapes whose bound is proved are answered',
  },
  'block.too-many': {
    sqlstate: '54000',
    message: 'this statement asks for more than {ceiling} {what} over private rows',
    hint: 'Ask for them in several statements, or for the groups of one aggregate: {example}',
    why: 'each share of a statement’s epsilon would be too small to answer anything, and planning it would keep others waiting',
  },
  'block.correlated': {
    sqlstate: '42501',
    message: 'an aggregate over private rows cannot use "{column}" of the surrounding query',
    hint: 'Join the surrounding table in and group by its column: {example}',
    why: 'it would be one release for each outer row',
  },
  'block.mixed': {
    sqlstate: '42501',
    message: 'private rows cannot be joined with {what} inside an aggregate',
    hint: 'Aggregate the private rows first and join the finished result: SELECT answer.*, other.n FROM ({example}) AS answer CROSS JOIN (VALUES (1)) AS other(n)',
    why: 'only rows of the policy’s tables have a proved owner and size',
  },
  'join.person': {
    sqlstate: '42501',
    message: 'rows of "{left}" and "{right}" are not joined on the person',
    hint: 'Join them on the {person}: {example}',
    why: 'every joined row must belong to one person',
  },
  'join.outer': {
    sqlstate: '42501',
    message: '{what} over private rows is not answered',
    hint: 'Use LEFT JOIN with the published table on the left, or an inner join: {example}',
    why: 'a row without a person has no owner',
  },
  'join.padding': {
    sqlstate: '42501',
    message: '{what} would count rows that belong to no person',
    hint: 'Aggregate a column of the private table: {example}',
    why: 'the padding rows of an outer join carry no person and reach no total',
  },
  'join.fan-out': {
    sqlstate: '42501',
    message: 'this join can multiply a person’s rows without bound',
    hint: 'Join on a unique key, or list fewer rows on the published side (at most {ceiling}): {example}',
    why: 'the time of the query would tell how many rows one person has',
  },
  'expr.function': {
    sqlstate: '42501',
    message: 'function {what} is not in the list of functions that may run on private rows',
    hint: 'Write the condition with comparisons, CASE, date_trunc or extract, or apply the function to the finished result: {example}',
    why: 'a function must be proved unable to raise on any row',
  },
  'expr.unsupported': {
    sqlstate: '42501',
    message: '{what} is not answered over private rows',
    hint: 'Use comparisons, IN, LIKE with a constant, CASE, coalesce, + - * /, date_trunc or extract, or apply it to the finished result: {example}',
    why: 'an expression must be proved unable to raise on any row',
  },
  'expr.unbounded': {
    sqlstate: '42501',
    message: '{expression} has no declared range, so this could overflow on some row',
    hint: 'Ask the DBA for a clamp on the column, or bound it with a column that has one; hedgerow.bounds lists them. What works: {example}',
    why: 'an error would tell that some row has an extreme value',
  },
  'expr.clamp': {
    sqlstate: '42501',
    message: '{what} needs a declared range of {expression}',
    hint: 'Ask the DBA for a clamp on the column; hedgerow.bounds lists the columns that have one. What works: {example}',
    why: 'without a range one person could change the total without bound',
  },
  'keys.form': {
    sqlstate: '42501',
    message: 'values of type {type} cannot be used as group keys',
    hint: 'Group by a text, number, date or boolean made from it, for example with date_trunc or CASE: {example}',
    why: 'equal values of this type can print apart, so a group could betray one person’s spelling',
  },
  'keys.too-many': {
    sqlstate: '42501',
    message: 'the declared keys make {count} groups or more, {ceiling} are answered at once',
    hint: 'Group by fewer columns or coarser ones, or name the groups you want with a LEFT JOIN from a published list',
    why: 'every declared group is answered, with noise, whether it is empty or not',
  },
  'keys.no-delta': {
    sqlstate: '42501',
    message: 'the keys of this GROUP BY are not declared, and choosing them from the data needs some delta, which this account does not have',
    hint: 'Group by declared columns (hedgerow.bounds lists them), or name the groups with a published list: {example}',
    why: 'showing a key that only one person has needs a small chance of failure',
  },
  'setting.bad': {
    sqlstate: '22023',
    message: 'invalid value for hedgerow.{name}: "{value}"',
    hint: 'It takes {expected}, for example SET hedgerow.{name} = {sample}',
    why: 'a setting that cannot be read must not be guessed',
  },
  'budget.spent': {
    sqlstate: '42501',
    message: '{account} budget cannot bear this statement: it asks for {asked}, and {left}',
    hint: 'SELECT * FROM hedgerow.budget shows what is left; a smaller SET hedgerow.epsilon may still fit; only an administrator can raise the cap',
    why: 'the cap is the promise to the people in the data',
  },
  'account.closed': {
    sqlstate: '42501',
    message: 'no budget is declared for "{user}" on "{dataset}"',
    hint: 'An administrator can add one to analysts.yaml',
    why: 'without an account nothing can be charged',
  },
  'account.overruns': {
    sqlstate: '42501',
    message: 'too many statements of this account have overrun their reply time, and it is paused',
    hint: 'An administrator can look at the vault and restart the account; simpler statements (fewer joins) stay within their time',
    why: 'each overrun tells a little about how long the rows took',
  },
  'release.deadline': {
    sqlstate: '57014',
    message: 'the statement did not finish within its time and was stopped; its charge stands',
    hint: 'Ask something simpler: fewer joins, fewer groups. Reference {reference}',
    why: 'a refund would tell how long the rows took',
  },
  'release.failed': {
    sqlstate: '58000',
    message: 'the answer could not be made; what was debited stands',
    hint: 'The operator finds the cause in the log under reference {reference}',
    why: 'the cause may hold a person’s value and is kept from the reply',
  },
  'pull.unreachable': {
    sqlstate: '58000',
    message: 'the lobby cannot reach hedgerow to answer this statement',
    hint: 'Run the statement again; if it fails again, ask whoever operates Hedgerow',
    why: 'the answer comes from Hedgerow, over a connection of the lobby’s own',
  },
  'names.hidden': {
    sqlstate: '42501',
    message: 'the temporary relation {name} hides the private table of the same name',
    hint: 'Drop or rename it, or write the private table with its schema',
    why: 'one name with two meanings would be charged for by mistake',
  },
  'shell.closed': {
    sqlstate: '42501',
    message: 'rows of {table} are people’s rows and cannot be read',
    hint: 'Aggregate them in a statement of its own, for example SELECT count(*) FROM {table}',
    why: 'the lobby holds no rows; whatever gets past the gate raises instead of answering',
  },
} as const satisfies Readonly<Record<string, RefusalRow>>
