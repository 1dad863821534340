import { z } from 'zod'
import { emailSchema } from '~/sign-in/email'
import { roles } from './permissions'

export const personSchema = z.object({
  name: z
    .string({ error: 'Give the name.' })
    .trim()
    .min(1, 'Give the name.')
    .max(120, 'At most 120 characters.'),
  email: emailSchema,
})
export type PersonInput = z.infer<typeof personSchema>

export const roleSchema = z.enum(roles, { error: 'Choose a role.' })

/** Inviting: the name is needed only for somebody whom the firm does not know yet. */
export const invitationSchema = z.object({
  email: emailSchema,
  name: z.string().trim().max(120, 'At most 120 characters.').optional(),
  role: roleSchema,
})
export type Invitation = z.infer<typeof invitationSchema>
