import type { Role } from '$lib/logbook/kinds';

/** The tables of the log, as migrations/2026-12-01-log.ts explains them. */
export interface LogTables {
	build: {
		id: string;
		/** The head: number of the last line, and the link after it. */
		seq: number;
		link: string;
		/** The highest n that devices go on counting from. */
		max_n: number;
		name: string;
		opened: number;
	};
	entry: {
		build: string;
		seq: number;
		id: string;
		hash: string;
		n: number;
		device: string;
		author: string;
		kind: string;
		v: number;
		seam: string | null;
		assembly: string | null;
		/** The canonical text; the envelope alone once the body was withdrawn. */
		text: string;
		/** Ms since 1970, server clock. */
		received: number;
		link: string;
		/** Name of the seal that covers it. */
		seal: string;
	};
	member: { build: string; person: string; role: Role; left: 0 | 1 };
	device: { build: string; device: string; person: string; key: string };
	seal: { build: string; name: string; device: string; hashes: string; signature: string };
	held: {
		build: string;
		id: string;
		hash: string;
		text: string;
		seal: string;
		carrier: string;
		waits_for: string;
		received: number;
	};
	quarantine: {
		build: string;
		id: string;
		hash: string;
		text: string | null;
		seal: string | null;
		carrier: string;
		code: string;
		stands_on: string | null;
		received: number;
		decision: 'discarded' | null;
		decided_by: string | null;
		decided_at: number | null;
	};
	withdrawn: { build: string; id: string; by: string };
}
