/** The ferry company's tables, without what is cheaper to add once they are full. Every name and number in them is invented. */
export const ferryTables = `
CREATE TABLE public.piers (
  pier_id integer NOT NULL,
  name text NOT NULL,
  zone integer NOT NULL,
  opened date NOT NULL
);
CREATE TABLE public.riders (
  rider_id integer NOT NULL,
  birth_year integer,
  district text NOT NULL,
  concession boolean NOT NULL,
  joined date NOT NULL
);
CREATE TABLE public.trips (
  trip_id integer NOT NULL,
  rider_id integer NOT NULL,
  boarded_at timestamptz NOT NULL,
  from_pier integer NOT NULL,
  to_pier integer NOT NULL,
  fare_pence integer NOT NULL,
  delay_min numeric(5,1)
);
CREATE TABLE public.complaints (
  complaint_id integer NOT NULL,
  trip_id integer NOT NULL,
  topic text NOT NULL,
  filed_on date NOT NULL
);
`

/** Keys, indexes and comments of the ferry company's tables, in the order in which they can be added. */
export const ferryConstraints: readonly string[] = [
  'ALTER TABLE public.piers ADD PRIMARY KEY (pier_id), ADD UNIQUE (name)',
  'ALTER TABLE public.riders ADD PRIMARY KEY (rider_id)',
  'ALTER TABLE public.trips ADD PRIMARY KEY (trip_id)',
  'CREATE INDEX trips_rider_id ON public.trips (rider_id)',
  'CREATE INDEX trips_boarded_at ON public.trips (boarded_at)',
  'ALTER TABLE public.trips ADD FOREIGN KEY (rider_id) REFERENCES public.riders, ADD FOREIGN KEY (from_pier) REFERENCES public.piers, ADD FOREIGN KEY (to_pier) REFERENCES public.piers',
  'ALTER TABLE public.complaints ADD PRIMARY KEY (complaint_id)',
  'CREATE INDEX complaints_trip_id ON public.complaints (trip_id)',
  'ALTER TABLE public.complaints ADD FOREIGN KEY (trip_id) REFERENCES public.trips',
]

/** Where riders live; a rider's usual pier follows from it. */
export const districts = ['Northbank', 'Eastquay', 'Saltmarsh', 'Gullhaven', 'Old Weir', 'Tidemill'] as const

/** What complaints are about: the later, the rarer; the last are too rare for an answer to name them. */
export const topics = [
  'delay',
  'crowding',
  'fares',
  'cleanliness',
  'access',
  'lost property',
  'signage',
  'engine noise',
  'gulls',
  'left behind',
  'ghost on deck',
] as const

/** A pier as published by the company. The last one opened after the last trip: its group is empty, and answers show it all the same. */
export interface Pier {
  readonly pier_id: number
  readonly name: string
  readonly zone: number
  readonly opened: string
}

/** All piers. */
export const piers: readonly Pier[] = [
  { pier_id: 1, name: 'North Steps', zone: 1, opened: '1921-05-01' },
  { pier_id: 2, name: 'Eastquay', zone: 1, opened: '1934-09-15' },
  { pier_id: 3, name: 'Saltmarsh', zone: 2, opened: '1958-04-01' },
  { pier_id: 4, name: 'Gullhaven', zone: 2, opened: '1966-06-20' },
  { pier_id: 5, name: 'Old Weir', zone: 1, opened: '1899-07-04' },
  { pier_id: 6, name: 'Tidemill', zone: 3, opened: '1987-03-28' },
  { pier_id: 7, name: 'Lantern Point', zone: 3, opened: '2009-05-09' },
  { pier_id: 8, name: 'Ropewalk', zone: 1, opened: '2018-10-01' },
  { pier_id: 9, name: 'Far Skerry', zone: 3, opened: '2026-12-31' },
]
