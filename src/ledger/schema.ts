/**
 * The ledger's own schema, as numbered steps. A step that was ever released is never changed: a later one changes what it made.
 * Amounts are whole numbers in the units of budget/amount.ts, kept as `numeric`: no ceiling, no rounding.
 */
export const steps: readonly string[] = [
  `
create table ledger.accounts (
  id text collate "C" primary key,
  renews text not null check (renews in ('never', 'month', 'quarter', 'year')),
  period text collate "C" not null,
  epsilon_spent numeric check (epsilon_spent >= 0 and scale(epsilon_spent) = 0),
  rho_spent numeric not null check (rho_spent >= 0 and scale(rho_spent) = 0),
  delta_spent numeric not null check (delta_spent >= 0 and scale(delta_spent) = 0),
  rho_ever numeric not null check (rho_ever >= rho_spent),
  delta_ever numeric not null check (delta_ever >= delta_spent)
);
comment on column ledger.accounts.epsilon_spent is 'null once a release without a pure epsilon was debited in this period';

create table ledger.charges (
  seq bigint primary key check (seq > 0),
  id uuid not null unique,
  at timestamptz not null,
  accounts text[] not null,
  periods text[] not null,
  epsilon numeric check (epsilon >= 0 and scale(epsilon) = 0),
  rho numeric not null check (rho >= 0 and scale(rho) = 0),
  delta numeric not null check (delta >= 0 and scale(delta) = 0),
  note jsonb not null,
  previous_mac bytea not null,
  mac bytea not null
);
create index charges_of_account on ledger.charges using gin (accounts);
create index charges_of_analyst on ledger.charges ((note ->> 'analyst'), (note ->> 'dataSet'), seq desc);

create table ledger.answers (
  id uuid primary key references ledger.charges (id),
  answer text not null,
  mac bytea not null
);

create table ledger.head (
  single boolean primary key default true check (single),
  seq bigint not null,
  mac bytea not null,
  seal bytea not null
);

create function ledger.forbid() returns trigger language plpgsql set search_path = pg_catalog, pg_temp as $$
begin
  raise exception '% of ledger.% is forbidden: the ledger is append-only', lower(tg_op), tg_table_name using errcode = '42501';
end
$$;
create trigger append_only before update or delete on ledger.charges for each row execute function ledger.forbid();
create trigger append_only_whole before truncate on ledger.charges for each statement execute function ledger.forbid();
create trigger append_only before update or delete on ledger.answers for each row execute function ledger.forbid();
create trigger append_only_whole before truncate on ledger.answers for each statement execute function ledger.forbid();
create trigger kept before delete on ledger.accounts for each row execute function ledger.forbid();
create trigger kept_whole before truncate on ledger.accounts for each statement execute function ledger.forbid();
create trigger kept before delete on ledger.head for each row execute function ledger.forbid();
create trigger kept_whole before truncate on ledger.head for each statement execute function ledger.forbid();

create function ledger.period_at(renews text, at timestamptz) returns text language sql stable set search_path = pg_catalog, pg_temp as $$
  select case renews
    when 'never' then 'always'
    when 'month' then to_char(at at time zone 'UTC', 'YYYY-MM')
    when 'quarter' then to_char(at at time zone 'UTC', 'YYYY-"Q"Q')
    when 'year' then to_char(at at time zone 'UTC', 'YYYY')
  end
$$;

-- What an account has spent in the period that holds now. The period is the greater of the stored one and the clock's, so that a clock set back
-- opens no second budget. Where the policy's renewal has changed, the new period's spending is added up again from the charges themselves.
create function ledger.standing(account text, wanted text)
returns table (period text, epsilon numeric, rho numeric, delta numeric, rho_ever numeric, delta_ever numeric)
language plpgsql stable set search_path = pg_catalog, pg_temp as $$
declare
  kept ledger.accounts;
  clock text collate "C" := ledger.period_at(wanted, clock_timestamp());
begin
  select a.* into kept from ledger.accounts a where a.id = account;
  if not found then
    return query select clock, 0::numeric, 0::numeric, 0::numeric, 0::numeric, 0::numeric;
  elsif kept.renews <> wanted then
    return query
      select clock,
             case when count(*) = count(c.epsilon) then coalesce(sum(c.epsilon), 0) end,
             coalesce(sum(c.rho), 0), coalesce(sum(c.delta), 0), kept.rho_ever, kept.delta_ever
        from ledger.charges c
       where c.accounts @> array[account] and ledger.period_at(wanted, c.at) collate "C" >= clock;
  elsif kept.period >= clock then
    return query select kept.period::text, kept.epsilon_spent, kept.rho_spent, kept.delta_spent, kept.rho_ever, kept.delta_ever;
  else
    return query select clock, 0::numeric, 0::numeric, 0::numeric, kept.rho_ever, kept.delta_ever;
  end if;
end
$$;

-- Debits every account that can bear charge and reserve, in the order of their ids, and locks the chain's head when all can.
-- The caller rolls back where one cannot. An epsilon of null is infinite: its comparison is null, which leaves the decision to rho.
create function ledger.debit(
  ids text[], renewals text[], epsilon_caps numeric[], rho_caps numeric[], delta_pots numeric[],
  charge_epsilon numeric, charge_rho numeric, charge_delta numeric,
  reserve_epsilon numeric, reserve_rho numeric, reserve_delta numeric)
returns table (account text, fits boolean, period text, epsilon text, rho text, delta text, rho_ever text, delta_ever text,
               head_seq text, head_mac text, head_seal text, at text)
language plpgsql set search_path = pg_catalog, pg_temp as $$
declare
  turn int;
  all_fit boolean := true;
begin
  perform set_config('synchronous_commit', 'on', true);
  for turn in select n from generate_subscripts(ids, 1) n order by ids[n] collate "C" loop
    insert into ledger.accounts values (ids[turn], renewals[turn], ledger.period_at(renewals[turn], clock_timestamp()), 0, 0, 0, 0, 0)
      on conflict do nothing;
    perform from ledger.accounts a where a.id = ids[turn] for update;
    update ledger.accounts a
       set renews = renewals[turn], period = now.period,
           epsilon_spent = now.epsilon + charge_epsilon, rho_spent = now.rho + charge_rho, delta_spent = now.delta + charge_delta,
           rho_ever = now.rho_ever + charge_rho, delta_ever = now.delta_ever + charge_delta
      from ledger.standing(ids[turn], renewals[turn]) now
     where a.id = ids[turn]
       and now.delta + charge_delta + reserve_delta <= delta_pots[turn]
       and (now.epsilon + charge_epsilon + reserve_epsilon <= epsilon_caps[turn] or now.rho + charge_rho + reserve_rho <= rho_caps[turn])
    returning true, a.period, a.epsilon_spent::text, a.rho_spent::text, a.delta_spent::text, a.rho_ever::text, a.delta_ever::text
      into fits, period, epsilon, rho, delta, rho_ever, delta_ever;
    account := ids[turn];
    fits := coalesce(fits, false);
    all_fit := all_fit and fits;
    return next;
  end loop;
  if all_fit then
    select null, null, h.seq::text, encode(h.mac, 'hex'), encode(h.seal, 'hex') into account, fits, head_seq, head_mac, head_seal from ledger.head h for update;
    at := to_char(clock_timestamp() at time zone 'UTC', 'YYYY-MM-DD"T"HH24:MI:SS.US"Z"');
    return next;
  end if;
end
$$;

create function ledger.append(
  seq bigint, id uuid, at timestamptz, accounts text[], periods text[], epsilon numeric, rho numeric, delta numeric, note jsonb,
  previous_mac bytea, mac bytea, seal bytea)
returns void language plpgsql set search_path = pg_catalog, pg_temp as $$
begin
  update ledger.head h set seq = $1, mac = $11, seal = $12 where h.seq = $1 - 1 and h.mac = $10;
  if not found then
    raise exception 'the chain has moved on' using errcode = '40000';
  end if;
  insert into ledger.charges values ($1, $2, $3, $4, $5, $6, $7, $8, $9, $10, $11);
end
$$;

revoke all on all functions in schema ledger from public;
`,
]
