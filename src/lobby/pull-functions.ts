import { literal } from './quote.ts'

/** Names of the hedgerow.* settings that a session sends along with a pull. */
export const sessionSettings = ['epsilon', 'delta', 'margin', 'confidence', 'noise', 'groups', 'rows', 'replay', 'nonnegative'] as const

/** The dblink functions that the private function below calls; nobody else may. */
export const dblinkFunctions = [
  'dblink_connect(text, text)',
  'dblink_disconnect(text)',
  'dblink_get_connections()',
  'dblink_is_busy(text)',
  'dblink_error_message(text)',
  'dblink_send_query(text, text)',
  'dblink_get_result(text)',
] as const

/**
 * The way out of an analyst's session: one JSON request over a named connection of this backend, one JSON reply. It waits by polling, since a blocking
 * wait inside libpq answers neither statement_timeout nor a cancel. Whatever ends the wait closes the connection, by which the other side learns of it.
 */
const ask = `
CREATE OR REPLACE FUNCTION hedgerow_inside.ask(kind text, body text, args jsonb, siblings jsonb) RETURNS jsonb
  LANGUAGE plpgsql VOLATILE PARALLEL UNSAFE SET search_path = pg_catalog, pg_temp AS $ask$
DECLARE
  line CONSTANT text := 'hedgerow_pull';
  request text;
  reply jsonb;
  pause float8 := 0.0005;
  looks int8 := 0;
BEGIN
  request := jsonb_build_object(
    'kind', kind,
    'pid', pg_backend_pid(),
    'user', session_user,
    'database', current_database(),
    'text', body,
    'args', (SELECT coalesce(jsonb_agg(to_jsonb(e.value) ORDER BY e.place), '[]') FROM jsonb_array_elements_text(args) WITH ORDINALITY AS e(value, place)),
    'siblings', siblings,
    'settings', (SELECT coalesce(jsonb_object_agg(s.name, current_setting('hedgerow.' || s.name)), '{}')
                   FROM unnest(${literal(`{${sessionSettings.join(',')}}`)}::text[]) AS s(name)
                  WHERE current_setting('hedgerow.' || s.name, true) <> ''),
    'timeZone', current_setting('TimeZone'),
    'now', transaction_timestamp(),
    'statement', statement_timestamp(),
    'application', current_setting('application_name'))::text;
  BEGIN
    IF line = ANY (coalesce(hedgerow_inside.dblink_get_connections(), '{}'))
       AND (hedgerow_inside.dblink_is_busy(line) = 1 OR hedgerow_inside.dblink_error_message(line) <> 'OK') THEN
      PERFORM hedgerow_inside.hang_up(line);
    END IF;
    IF NOT line = ANY (coalesce(hedgerow_inside.dblink_get_connections(), '{}')) THEN
      PERFORM hedgerow_inside.dblink_connect(line, 'hedgerow_pull');
    END IF;
    IF hedgerow_inside.dblink_send_query(line, 'pull ' || request) = 1 THEN
      WHILE hedgerow_inside.dblink_is_busy(line) = 1 LOOP
        looks := looks + 1;
        -- Each look takes in one buffer of a long reply: several looks between two pauses, or the pauses would add up.
        CONTINUE WHEN looks % 32 <> 0;
        PERFORM pg_sleep(pause);
        pause := least(pause * 1.3, 0.02);
      END LOOP;
      SELECT t.c1::jsonb INTO reply FROM hedgerow_inside.dblink_get_result(line) AS t(c1 text);
      PERFORM FROM hedgerow_inside.dblink_get_result(line) AS t(c1 text);
    END IF;
  EXCEPTION
    WHEN query_canceled THEN
      PERFORM hedgerow_inside.hang_up(line);
      RAISE;
    WHEN OTHERS THEN
      PERFORM hedgerow_inside.hang_up(line);
      reply := NULL;
  END;
  IF reply ->> 'kind' = 'rows' THEN
    IF reply ->> 'notice' <> '' THEN
      RAISE NOTICE '%', reply ->> 'notice';
    END IF;
    RETURN reply -> 'rows';
  ELSIF reply ->> 'kind' = 'error' AND reply ->> 'hint' <> '' THEN
    RAISE EXCEPTION USING ERRCODE = reply ->> 'sqlstate', MESSAGE = reply ->> 'message', HINT = reply ->> 'hint';
  ELSIF reply ->> 'kind' = 'error' THEN
    RAISE EXCEPTION USING ERRCODE = reply ->> 'sqlstate', MESSAGE = reply ->> 'message';
  END IF;
  PERFORM hedgerow_inside.hang_up(line);
  RAISE EXCEPTION USING ERRCODE = '58000', MESSAGE = 'the lobby cannot reach hedgerow to answer this statement [pull.unreachable]',
    HINT = 'Run the statement again; if it fails again, ask whoever operates Hedgerow.';
END
$ask$`

const hangUp = `
CREATE OR REPLACE FUNCTION hedgerow_inside.hang_up(line text) RETURNS void
  LANGUAGE plpgsql VOLATILE PARALLEL UNSAFE SET search_path = pg_catalog, pg_temp AS $hang$
BEGIN
  IF line = ANY (coalesce(hedgerow_inside.dblink_get_connections(), '{}')) THEN
    PERFORM hedgerow_inside.dblink_disconnect(line);
  END IF;
END
$hang$`

const pull = `
CREATE OR REPLACE FUNCTION hedgerow.pull(block text, args jsonb, siblings jsonb DEFAULT '[]', names text[] DEFAULT '{}') RETURNS jsonb
  LANGUAGE plpgsql VOLATILE PARALLEL UNSAFE SECURITY DEFINER SET search_path = pg_catalog, pg_temp AS $pull$
DECLARE
  hiding text;
BEGIN
  SELECT c.relname INTO hiding FROM pg_class c
   WHERE c.relnamespace = pg_my_temp_schema() AND c.relname = ANY (names) AND c.relkind IN ('r', 'v', 'm', 'p', 'f') LIMIT 1;
  IF hiding IS NOT NULL THEN
    RAISE EXCEPTION USING ERRCODE = '42501',
      MESSAGE = format('the temporary relation %I hides the private table of the same name [names.hidden]', hiding),
      HINT = format('Drop or rename it: ALTER TABLE pg_temp.%I RENAME TO %I; or write the private table with its schema.', hiding, 'my_' || hiding);
  END IF;
  IF jsonb_typeof(args) <> 'array' OR jsonb_path_exists(args, 'strict $[*] ? (@.type() == "object")')
     OR jsonb_path_exists(args, 'strict $[*] ? (@.type() == "array")[*] ? (@.type() == "array" || @.type() == "object")')
     OR jsonb_typeof(siblings) <> 'array' OR jsonb_path_exists(siblings, 'strict $[*] ? (@.type() != "string")') THEN
    RAISE EXCEPTION USING ERRCODE = '22023', MESSAGE = 'hedgerow.pull takes its arguments as a JSON array of values, and its siblings as one of texts',
      HINT = 'Write the statement itself: Hedgerow makes the call.';
  END IF;
  RETURN hedgerow_inside.ask('release', coalesce(block, ''), coalesce(args, '[]'), coalesce(siblings, '[]'));
END
$pull$`

const explain = `
CREATE OR REPLACE FUNCTION hedgerow.explain(statement text, args jsonb DEFAULT '[]') RETURNS SETOF text
  LANGUAGE plpgsql VOLATILE PARALLEL UNSAFE SECURITY DEFINER SET search_path = pg_catalog, pg_temp AS $explain$
BEGIN
  RETURN QUERY SELECT r.c1 FROM jsonb_to_recordset(hedgerow_inside.ask('explain', coalesce(statement, ''), CASE jsonb_typeof(args) WHEN 'array' THEN args ELSE '[]' END, '[]')) AS r(c1 text);
END
$explain$`

const read = `
CREATE OR REPLACE FUNCTION hedgerow.read(kind text) RETURNS jsonb
  LANGUAGE plpgsql VOLATILE PARALLEL UNSAFE SECURITY DEFINER SET search_path = pg_catalog, pg_temp AS $read$
BEGIN
  IF kind IS NULL OR kind NOT IN ('budget', 'charges', 'last_answer', 'bounds') THEN
    RAISE EXCEPTION USING ERRCODE = '22023', MESSAGE = 'hedgerow.read knows budget, charges, last_answer and bounds',
      HINT = 'Read the views instead: SELECT * FROM hedgerow.budget';
  END IF;
  RETURN hedgerow_inside.ask(kind, '', '[]', '[]');
END
$read$`

/**
 * Raises wherever a shell is planned to be scanned. IMMUTABLE on purpose: the planner then evaluates it by itself, so that it raises even for a table without
 * rows, under an index condition, or where no row would be reached (a STABLE one is a filter on each row, and an empty table has none).
 */
const noScan = `
CREATE OR REPLACE FUNCTION hedgerow_inside.no_scan(relation text) RETURNS boolean
  LANGUAGE plpgsql IMMUTABLE PARALLEL SAFE SET search_path = pg_catalog, pg_temp AS $scan$
BEGIN
  IF current_user = 'hedgerow_owner' THEN
    RETURN true;
  END IF;
  RAISE EXCEPTION USING ERRCODE = '42501', MESSAGE = format('rows of %s are people''s rows and cannot be read [shell.closed]', relation),
    HINT = format('Aggregate them in a statement of its own, for example SELECT count(*) FROM %s', relation);
END
$scan$`

/** The functions in the order they are made; `open` ones an analyst may call. All are owned by hedgerow_owner. */
export const lobbyFunctions = [
  { signature: 'hedgerow_inside.hang_up(text)', text: hangUp, open: false },
  { signature: 'hedgerow_inside.ask(text, text, jsonb, jsonb)', text: ask, open: false },
  { signature: 'hedgerow_inside.no_scan(text)', text: noScan, open: true },
  { signature: 'hedgerow.pull(text, jsonb, jsonb, text[])', text: pull, open: true },
  { signature: 'hedgerow.explain(text, jsonb)', text: explain, open: true },
  { signature: 'hedgerow.read(text)', text: read, open: true },
] as const
