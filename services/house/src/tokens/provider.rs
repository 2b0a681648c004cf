//! Ed25519 and nothing else behind the token library: no RSA and no other curve is even compiled in.

use ed25519_dalek::pkcs8::DecodePrivateKey;
use ed25519_dalek::{Signature, SigningKey, VerifyingKey};
use jsonwebtoken::crypto::{CryptoProvider, JwtSigner, JwtVerifier, KeyUtils};
use jsonwebtoken::errors::{Error, ErrorKind};
use jsonwebtoken::signature::{self, Signer, Verifier};
use jsonwebtoken::{Algorithm, AlgorithmFamily, DecodingKey, EncodingKey};

static PROVIDER: CryptoProvider = CryptoProvider {
    signer_factory: signer,
    verifier_factory: verifier,
    key_utils: KeyUtils::new_unimplemented(),
};

/// Makes this the process's provider. The library takes only the first one, and this is the only one we have.
pub(super) fn install() {
    let already_there = PROVIDER.install_default().is_err();
    tracing::trace!(already_there, "token signer installed");
}

struct Signing(SigningKey);
struct Checking(VerifyingKey);

impl Signer<Vec<u8>> for Signing {
    fn try_sign(&self, message: &[u8]) -> Result<Vec<u8>, signature::Error> {
        Ok(self.0.sign(message).to_bytes().to_vec())
    }
}

impl JwtSigner for Signing {
    fn algorithm(&self) -> Algorithm {
        Algorithm::EdDSA
    }
}

impl Verifier<Vec<u8>> for Checking {
    fn verify(&self, message: &[u8], signature: &Vec<u8>) -> Result<(), signature::Error> {
        let signature = Signature::from_slice(signature).map_err(|_| signature::Error::new())?;
        self.0.verify_strict(message, &signature).map_err(|_| signature::Error::new())
    }
}

impl JwtVerifier for Checking {
    fn algorithm(&self) -> Algorithm {
        Algorithm::EdDSA
    }
}

#[expect(clippy::trivially_copy_pass_by_ref, reason = "the library's signature")]
fn signer(algorithm: &Algorithm, key: &EncodingKey) -> Result<Box<dyn JwtSigner>, Error> {
    if *algorithm != Algorithm::EdDSA || key.family() != AlgorithmFamily::Ed {
        return Err(ErrorKind::InvalidAlgorithm.into());
    }
    let key = SigningKey::from_pkcs8_der(key.as_bytes()).map_err(|_| ErrorKind::InvalidEddsaKey)?;
    Ok(Box::new(Signing(key)))
}

#[expect(clippy::trivially_copy_pass_by_ref, reason = "the library's signature")]
fn verifier(algorithm: &Algorithm, key: &DecodingKey) -> Result<Box<dyn JwtVerifier>, Error> {
    if *algorithm != Algorithm::EdDSA || key.family() != AlgorithmFamily::Ed {
        return Err(ErrorKind::InvalidAlgorithm.into());
    }
    let bytes: &[u8; 32] =
        key.try_get_as_bytes()?.try_into().map_err(|_| ErrorKind::InvalidEddsaKey)?;
    let key = VerifyingKey::from_bytes(bytes).map_err(|_| ErrorKind::InvalidEddsaKey)?;
    Ok(Box::new(Checking(key)))
}
