/**
 * Stems of the passwords people choose most (common practice, from memory, no source). A password is reduced to its
 * stem before it is looked up here, so one entry stands for all that begin with it and go on in digits and signs.
 */
export const commonStems: ReadonlySet<string> = new Set(
  (
    'password passwort passw0rd motdepasse contrasena senha parola wachtwoord haslo heslo salasana kennwort losenord ' +
    'qwerty qwertz azerty qwertyuiop qwertzuiop azertyuiop asdfghjkl asdfgh zxcvbnm yxcvbnm qazwsxedc qazwsx 1q2w3e4r 1qaz2wsx zaq12wsx ' +
    'letmein letmeinnow welcome welcomehome willkommen bienvenue admin administrator root superuser login signin master access default changeme changethis ' +
    'secret topsecret geheim iloveyou ichliebedich jetaime teamo sunshine princess monkey dragon football baseball basketball fussball superman batman spiderman ' +
    'starwars pokemon shadow michael jennifer jordan charlie summer winter spring autumn sommer winterzeit monday freedom whatever trustno ' +
    'computer internet samsung google facebook hello hellohello helloworld halloween hallohallo ninja mustang ferrari mercedes flower cheese chocolate cookie ' +
    'abc abcabc abcd abcdef abcdefgh abcdefghijkl aaaaaa test testtest testing testpassword temp temporary guest user username demo sample example ' +
    'mypassword yourpassword thispassword newpassword oldpassword passwordpassword password1password nopassword ihatepasswords correcthorsebatterystaple ' +
    'evenfall gravity gravitation torsion balance pendulum laboratory lab'
  ).split(' '),
);
