import { createContext } from 'react-router'

export interface SignedIn {
  userId: number
  name: string
  email: string
  isAdministrator: boolean
}

/** Filled by `requireSignIn` for every loader and action below it. */
export const signedInContext = createContext<SignedIn>()
