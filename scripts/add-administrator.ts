import { environment } from '../app/environment.server.ts'
import { addPerson, findPersonByEmail, setAdministrator } from '../app/projects/people.server.ts'
import { personSchema } from '../app/projects/person.ts'
import { connectDatabase, disconnectDatabase } from '../database/connection.server.ts'
import { reportAndFail } from './services/report-and-fail.ts'

/**
 * npm run add-administrator -- EMAIL [NAME]: makes the firm's first person, who then adds the others on the page.
 * Works again for somebody who is known already. Without a name the address lends its first part.
 */
async function addAdministrator(email: string, name: string): Promise<string> {
  const { address, database: settings } = environment()
  const parsed = personSchema.safeParse({
    email,
    name: name || email.replace(/@.*/, '').replaceAll('.', ' '),
  })
  if (!parsed.success) {
    const problems = parsed.error.issues.map(({ message }) => message).join(' ')
    throw new Error(`${problems}\nUse: npm run add-administrator -- EMAIL [NAME]`)
  }
  const person = parsed.data
  const database = connectDatabase(settings)
  try {
    const known = await findPersonByEmail(database, person.email)
    if (known) {
      const refusal = await setAdministrator(database, known.id, true)
      if (refusal) throw new Error(`${person.email}: ${refusal}.`)
    } else {
      await addPerson(database, { ...person, isAdministrator: true })
    }
    return `${person.email} is an administrator. Sign in at ${address}/sign-in`
  } finally {
    await disconnectDatabase()
  }
}

const [email = '', ...name] = process.argv.slice(2)
await addAdministrator(email, name.join(' '))
  .then((sentence) => console.log(sentence))
  .catch(reportAndFail)
