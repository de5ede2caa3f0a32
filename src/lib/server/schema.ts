import type { LogTables } from './log/tables';

/**
 * The tables as the code of today sees them, one property per table. A migration never imports
 * this: it runs on the tables as they were. Times are milliseconds since 1970.
 */
export interface Database extends LogTables {
	person: PersonTable;
	session: SessionTable;
	sign_in_try: SignInTryTable;
}

interface PersonTable {
	id: string;
	/** As typed. */
	email: string;
	/** What accounts are found by, see auth/email.ts. */
	email_key: string;
	name: string;
	password_hash: string;
	created: number;
}

interface SessionTable {
	/** SHA-256 of the token. */
	id: string;
	person_id: string;
	created: number;
	expires: number;
}

interface SignInTryTable {
	/** What is limited and for whom, see auth/throttle.ts. */
	key: string;
	since: number;
	tries: number;
}
