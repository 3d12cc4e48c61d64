import { z } from 'zod/v4';

/** Query of every list: an opaque cursor from the page before, and how many items at most. */
export const listQuerySchema = z.object({
  cursor: z.string().max(200).optional(),
  limit: z.coerce.number().int().min(1).max(500).default(50),
});
export type ListQuery = z.infer<typeof listQuerySchema>;

export const listOf = <T extends z.ZodType>(item: T) =>
  z.object({ items: z.array(item), nextCursor: z.string().nullable() });

export interface List<T> {
  items: T[];
  nextCursor: string | null;
}

export const idSchema = z.uuid();
