import { z } from 'zod/v4';

export const ROLES = ['viewer', 'designer', 'reviewer', 'admin'] as const;
/** viewer < designer < reviewer < admin: each may do all that the one before may. */
export const roleSchema = z.enum(ROLES);
export type Role = z.infer<typeof roleSchema>;

export const emailSchema = z.email('Give an e-mail address such as name@example.org.').max(254).transform((s) => s.toLowerCase());
export const passwordSchema = z
  .string()
  .min(12, 'A password needs at least 12 characters.')
  .max(200, 'A password may have at most 200 characters.');

export const signInSchema = z.strictObject({ email: emailSchema, password: z.string().min(1).max(200) });
export type SignIn = z.infer<typeof signInSchema>;

export const changePasswordSchema = z.strictObject({
  currentPassword: z.string().min(1).max(200),
  newPassword: passwordSchema,
});

export const membershipSchema = z.object({ teamId: z.string(), teamName: z.string(), role: roleSchema });

export const meSchema = z.object({
  id: z.string(),
  email: z.string(),
  name: z.string(),
  /** True after an administrator set the password: nothing else works until it is changed. */
  mustChangePassword: z.boolean(),
  memberships: z.array(membershipSchema),
});
export type Me = z.infer<typeof meSchema>;

export const createTeamSchema = z.strictObject({ name: z.string().trim().min(1).max(100) });
export const teamSchema = z.object({ id: z.string(), name: z.string(), createdAt: z.string(), role: roleSchema });
export type Team = z.infer<typeof teamSchema>;

export const memberSchema = z.object({
  userId: z.string(),
  name: z.string(),
  email: z.string(),
  role: roleSchema,
  joinedAt: z.string(),
});
export type Member = z.infer<typeof memberSchema>;

export const addMemberSchema = z.strictObject({
  email: emailSchema,
  name: z.string().trim().min(1).max(100),
  role: roleSchema,
});
/** `oneTimePassword` only when the person had no account: shown once, must be changed at the first sign-in. */
export const addedMemberSchema = memberSchema.extend({ oneTimePassword: z.string().nullable() });
export type AddedMember = z.infer<typeof addedMemberSchema>;
export const changeRoleSchema = z.strictObject({ role: roleSchema });
