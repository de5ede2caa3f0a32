/**
 * Who may write what. Decided once, by the server when it accepts a line, from the crew lines of the log itself;
 * the device asks the same table before it offers an action; the fold never judges again.
 */
import type { Envelope } from './entry';
import { traits, type Role } from './kinds';
import type { RefusalCode } from './refusals';

/** May somebody in this role write lines of this kind? Strikes have a rule of their own: {@link mayStrike}. */
export function mayWrite(role: Role, kind: string, v = 1): boolean {
	switch (traits(kind, v)?.writer) {
		case 'follower':
			return true;
		case 'builder':
			return role !== 'follower';
		case 'inspector':
			return role === 'inspector';
		case 'inspector_or_owner':
			return role === 'inspector' || role === 'owner';
		case 'owner':
			return role === 'owner';
		case 'server':
		case undefined:
			return false;
	}
}

/**
 * Why `author` in this role may not strike `target`, or undefined when they may: one's own line; the owner any
 * but a verdict; a verdict only whoever signed it.
 */
export function strikeRefusal(
	author: string,
	role: Role,
	target: Pick<Envelope, 'kind' | 'v' | 'author'>
): RefusalCode | undefined {
	if (!traits(target.kind, target.v)?.strikable) return 'strike.not_strikable';
	if (target.author === author) return undefined;
	if (target.kind === 'inspection.signed') return 'strike.verdict';
	return role === 'owner' ? undefined : 'strike.not_yours';
}
