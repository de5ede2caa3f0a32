/**
 * The live stream: tells the phones of a person how far the history of each of their builds reaches. It carries no
 * lines; whoever hears of a new head pulls. So a message that is lost or told twice does no harm.
 */
import type { z } from 'zod';
import { sql } from 'kysely';
import type { LiveMessage } from '$lib/logbook/wire';
import type { Db } from '../db';
import { log } from '../logger';
import { whenDraining } from '../process';

/** Another process may write to the same database; what it writes is seen after so long. */
const LOOK_EVERY = 1000;
/** Proxies cut a connection on which nothing moves, most of them after 30 or 60 s. */
const PING_EVERY = 20_000;
/** Sessions are looked at every third time: a revoked one must fall silent within 5 s. */
const SESSIONS_EVERY = 3;
const MOST_PER_PERSON = 20;
/** Messages waiting for a reader that does not read. */
const MOST_WAITING = 500;

interface Stream {
	readonly person: string;
	readonly session: string;
	readonly controller: ReadableStreamDefaultController<Uint8Array>;
	/** What this stream was told last of each build the person is in; undefined until the first look. */
	told: Map<string, number> | undefined;
}

const encoder = new TextEncoder();

export class Live {
	readonly #db: Db;
	readonly #streams = new Set<Stream>();
	#timer: NodeJS.Timeout | undefined;
	#looks = 0;
	#pinged = 0;
	#forgetHook: (() => void) | undefined;

	constructor(db: Db) {
		this.#db = db;
	}

	/** Opens the stream of a person. It ends with the session, with a build they are removed from, and on shutdown. */
	open(person: string, session: string): ReadableStream<Uint8Array> {
		let stream: Stream | undefined;
		return new ReadableStream<Uint8Array>(
			{
				start: (controller) => {
					stream = { person, session, controller, told: undefined };
					this.#add(stream);
				},
				cancel: () => {
					if (stream) this.#remove(stream);
				}
			},
			new CountQueuingStrategy({ highWaterMark: MOST_WAITING })
		);
	}

	/** To be called after the commit that moved a head. */
	headMoved(build: string, head: number): void {
		for (const stream of this.#streams) {
			const told = stream.told?.get(build);
			if (told !== undefined && told !== head) this.#tell(stream, build, head);
		}
	}

	/** To be called after the commit that changed a crew: somebody may have a new build, or must hear no more. */
	crewChanged(): void {
		void this.#look();
	}

	/** Ends all streams. */
	close(): void {
		for (const stream of [...this.#streams]) this.#end(stream);
	}

	#add(stream: Stream): void {
		const mine = [...this.#streams].filter((other) => other.person === stream.person);
		const oldest = mine[0];
		if (oldest && mine.length >= MOST_PER_PERSON) this.#end(oldest);
		this.#streams.add(stream);
		// Reaches the phone at once: it knows that it is connected before anything happens.
		this.#send(stream, ': open\n\n');
		if (this.#timer === undefined) {
			this.#timer = setInterval(() => void this.#look(), LOOK_EVERY);
			this.#timer.unref();
			this.#pinged = Date.now();
			this.#forgetHook = whenDraining(() => {
				this.close();
			});
		}
		void this.#look();
	}

	#remove(stream: Stream): void {
		this.#streams.delete(stream);
		if (this.#streams.size > 0) return;
		clearInterval(this.#timer);
		this.#timer = undefined;
		this.#forgetHook?.();
	}

	#end(stream: Stream): void {
		this.#remove(stream);
		try {
			stream.controller.close();
		} catch {
			// The reader was gone first.
		}
	}

	#send(stream: Stream, text: string): void {
		try {
			if ((stream.controller.desiredSize ?? 0) <= 0) this.#end(stream);
			else stream.controller.enqueue(encoder.encode(text));
		} catch {
			this.#remove(stream);
		}
	}

	#tell(stream: Stream, build: string, head: number): void {
		stream.told?.set(build, head);
		const message: z.infer<typeof LiveMessage> = { build, head };
		this.#send(stream, `data: ${JSON.stringify(message)}\n\n`);
	}

	/** One question for all heads that anybody watches. */
	async #look(): Promise<void> {
		try {
			const rows = await this.#db
				.selectFrom('member')
				.innerJoin('build', 'build.id', 'member.build')
				.select(['member.person', 'build.id', 'build.seq'])
				.where('member.left', '=', 0)
				.where(
					'member.person',
					'in',
					this.#listOf((stream) => stream.person)
				)
				.execute();
			const heads = new Map<string, Map<string, number>>();
			for (const { person, id, seq } of rows) {
				const builds = heads.get(person) ?? new Map<string, number>();
				heads.set(person, builds.set(id, seq));
			}
			for (const stream of [...this.#streams])
				this.#compare(stream, heads.get(stream.person) ?? new Map<string, number>());
			if (this.#looks++ % SESSIONS_EVERY === 0) await this.#endRevoked();
		} catch (error) {
			// The database is busy or closing; the next look tells what this one could not.
			log().warn({ err: error }, 'live heads not read');
		}
		if (Date.now() - this.#pinged < PING_EVERY) return;
		this.#pinged = Date.now();
		for (const stream of [...this.#streams]) this.#send(stream, ': ping\n\n');
	}

	#compare(stream: Stream, heads: ReadonlyMap<string, number>): void {
		const told = (stream.told ??= new Map<string, number>());
		for (const build of told.keys()) {
			// Removed from a build: the phone opens a new stream and learns there what it may still hear.
			if (!heads.has(build)) {
				this.#end(stream);
				return;
			}
		}
		for (const [build, head] of heads)
			if (told.get(build) !== head) this.#tell(stream, build, head);
	}

	async #endRevoked(): Promise<void> {
		const rows = await this.#db
			.selectFrom('session')
			.select('id')
			.where(
				'id',
				'in',
				this.#listOf((stream) => stream.session)
			)
			.where('expires', '>', Date.now())
			.execute();
		const valid = new Set(rows.map((row) => row.id));
		for (const stream of [...this.#streams]) if (!valid.has(stream.session)) this.#end(stream);
	}

	#listOf(of: (stream: Stream) => string) {
		const values = JSON.stringify([...new Set([...this.#streams].map(of))]);
		return sql<string>`(select value from json_each(${values}))`;
	}
}
