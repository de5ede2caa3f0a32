import { hash, verify } from '@node-rs/argon2';
import { readable } from './password-rules';

/** OWASP's costs for argon2id, the package's default, with one thread. Raising a cost here changes new hashes only. */
export const COST = { memoryCost: 19_456, timeCost: 2, parallelism: 1 } as const;

/**
 * Two hashes at a time keep a core and half of libuv's threads for everybody else; beyond so many in
 * the queue a flood would only make people wait longer than their browser does.
 */
const AT_ONCE = 2;
const MOST_WAITING = 100;

/** Too many passwords are being checked at once; try again in a few seconds. */
export class HashingBusyError extends Error {
	override name = 'HashingBusyError';
}

/**
 * A hash at the present cost of a password nobody knows. Checked when there is no such account, so
 * that the answer takes as long as for one that exists.
 */
export const NOBODYS_HASH =
	'$argon2id$v=19$m=19456,t=2,p=1$94ZUX90IXbp1TBGTen4yoQ$bMTuRhSIRDV/6p2ZH+FjF9LbAI6UbhWTdDxUpWQa9Ws';

let running = 0;
const waiting: (() => void)[] = [];

async function inTurn<T>(work: () => Promise<T>): Promise<T> {
	if (running >= AT_ONCE) {
		if (waiting.length >= MOST_WAITING) throw new HashingBusyError('too many passwords at once');
		// Whoever ends hands its place over, so `running` stays as it is.
		await new Promise<void>((go) => waiting.push(go));
	} else {
		running++;
	}
	try {
		return await work();
	} finally {
		const next = waiting.shift();
		if (next === undefined) running--;
		else next();
	}
}

/**
 * The argon2id hash of a password as a PHC string, each with a salt of its own.
 * Throws HashingBusyError.
 */
export function hashPassword(password: string): Promise<string> {
	return inTurn(() => hash(readable(password), COST));
}

/** Whether the password is the one that was hashed. Throws HashingBusyError. */
export function verifyPassword(passwordHash: string, password: string): Promise<boolean> {
	return inTurn(() => verify(passwordHash, readable(password)));
}
