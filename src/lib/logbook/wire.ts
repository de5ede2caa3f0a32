/**
 * The messages between devices and the server. Old phones go on speaking old versions of these for years:
 * requests grow by optional fields only, and answers are read leniently (unknown fields are ignored).
 *
 * Entries travel as their canonical text, a JSON string inside the message: what is hashed is what was sent, and one
 * unreadable entry does not spoil the message around it.
 */
import * as z from 'zod/mini';
import { MOST_BYTES_SIGNED } from './entry';
import { Hash, Id, Role, Signature, WallTime, whole } from './scalars';

/** At most so many entries and bytes in a push. The client halves on 413. */
export const MOST_PUSHED = 200;
export const MOST_PUSHED_BYTES = 1024 * 1024;
/** Lines in a page of a pull, unless fewer are asked for. */
export const PAGE = 1000;

const seq = whole(0, Number.MAX_SAFE_INTEGER);
const received = whole(0, 8_640_000_000_000_000);

const Place = z.object({ seq, link: Hash });
/** A place with the server's signature over it (`placeStatement`): proof that it was once the history. */
export const SignedPlace = z.object({ seq, link: Hash, signature: Signature });
export type SignedPlace = z.output<typeof SignedPlace>;

export const SealMessage = z.object({
	device: Id,
	hashes: z.array(Hash).check(z.minLength(1), z.maxLength(1000)),
	signature: Signature
});

/**
 * Proof that lines were accepted before the server's history changed: from a place, so many (received, hash), and the
 * server's signature over the place they lead to. The lines whose hashes stand in it are accepted again unjudged.
 */
export const Proof = z.object({
	after: Place,
	rows: z.array(z.tuple([received, Hash])).check(z.minLength(1), z.maxLength(PAGE)),
	signature: Signature
});
export type Proof = z.output<typeof Proof>;

export const PushRequest = z.object({
	device: Id,
	cursor: Place,
	sentAt: WallTime,
	entries: z
		.array(z.string().check(z.maxLength(MOST_BYTES_SIGNED)))
		.check(z.maxLength(MOST_PUSHED)),
	seals: z.array(SealMessage).check(z.maxLength(MOST_PUSHED + 1)),
	proofs: z.optional(z.array(Proof).check(z.maxLength(20)))
});
export type PushRequest = z.output<typeof PushRequest>;

/**
 * accepted, duplicate: it is on the server's disk. held: it is too, but waits for a line it refers to.
 * pending: in quarantine, the owner has not decided. discarded: the owner decided against it. refused: see the code.
 */
const PushStatus = z.enum(['accepted', 'duplicate', 'held', 'pending', 'discarded', 'refused']);
export const PushResult = z.object({
	/** Null when it could not be made out; results stand in the order of the entries. */
	id: z.nullable(z.string()),
	status: PushStatus,
	code: z.optional(z.string())
});
export type PushResult = z.output<typeof PushResult>;
export const PushAnswer = z.object({
	/** Where the server's history stands after this push. */
	cursor: SignedPlace,
	maxN: z.int(),
	results: z.array(PushResult),
	/** Two stores use this device's id (a copied profile): make a new device. */
	mint: z.optional(z.boolean())
});
export type PushAnswer = z.output<typeof PushAnswer>;

export const PulledLine = z.object({
	seq,
	received,
	/** Index into `seals`. */
	seal: z.optional(z.int()),
	text: z.optional(z.string()),
	/** Instead of the text, for a line whose body was withdrawn. */
	withdrawn: z.optional(z.object({ hash: Hash, envelope: z.string(), by: Id }))
});
export type PulledLine = z.output<typeof PulledLine>;
export const PullAnswer = z.object({
	entries: z.array(PulledLine),
	seals: z.array(SealMessage),
	/** The place after the last of these lines: the next `after`. */
	next: SignedPlace,
	/** Number of the last line of the build. */
	head: seq,
	maxN: z.int()
});
export type PullAnswer = z.output<typeof PullAnswer>;
export const PullQuery = z.object({
	after: z._default(z.coerce.number().check(z.int(), z.gte(0)), 0),
	link: z.optional(Hash),
	limit: z._default(z.coerce.number().check(z.int(), z.gte(1), z.lte(PAGE)), PAGE)
});
export type PullQuery = z.output<typeof PullQuery>;

export const HaveRequest = z.object({ ids: z.array(Id).check(z.maxLength(5000)) });
export const HaveAnswer = z.object({ lacking: z.array(Id) });

export const CrewMember = z.object({
	person: Id,
	name: z.string(),
	role: Role,
	left: z.optional(z.boolean())
});
export type CrewMember = z.output<typeof CrewMember>;
export const CrewAnswer = z.object({ crew: z.array(CrewMember) });

export const BuildsAnswer = z.object({
	builds: z.array(
		z.object({
			build: Id,
			name: z.string(),
			role: z.nullable(Role),
			removed: z.optional(z.boolean()),
			head: seq,
			quarantined: z.optional(z.int())
		})
	)
});
export type BuildsAnswer = z.output<typeof BuildsAnswer>;

export const QuarantinedLine = z.object({
	id: z.string(),
	/** Several lines may wait under one id; this tells them apart. */
	hash: z.optional(Hash),
	code: z.string(),
	/** Null when the line is too broken to be shown. */
	text: z.nullable(z.string()),
	carrier: Id,
	at: received,
	acceptable: z.boolean()
});
export type QuarantinedLine = z.output<typeof QuarantinedLine>;
export const QuarantineAnswer = z.object({ lines: z.array(QuarantinedLine) });
export const QuarantineDecision = z.object({
	ids: z.array(Id).check(z.minLength(1), z.maxLength(MOST_PUSHED)),
	/** Only the lines with these hashes, of those with these ids. */
	hashes: z.optional(z.array(Hash).check(z.maxLength(MOST_PUSHED))),
	decision: z.enum(['accept', 'discard'])
});

/** One message of the live stream: "the history of this build now reaches this far". */
export const LiveMessage = z.object({ build: Id, head: seq });

/** How every refusal of a whole request looks. */
export const ErrorAnswer = z.object({
	code: z.string(),
	says: z.string(),
	requestId: z.optional(z.string())
});

/** The header that names the person whose store sends the request; the live stream has `?person=` instead. */
export const PERSON_HEADER = 'x-tallybar-person';
